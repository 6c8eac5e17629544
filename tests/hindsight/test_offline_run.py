"""`margent associate --offline`: files, explanations and causes of a run that looked back."""

import csv
import json
import shutil
from pathlib import Path

import numpy as np
import pyarrow.parquet as pq
import pytest

from tests.hindsight.scenes import collected, log_of
from tracker import diagnose, explain, read_log, read_run, read_truth, track_log
from tracker.cli.main import run
from tracker.errors import SettingsError
from tracker.hindsight import look_back, rows_in_hindsight
from tracker.motion import ConstantVelocity
from tracker.settings import Settings, load_settings

SAMPLE = Path(__file__).resolve().parent.parent.parent / "sample_sequences" / "forecourt"


@pytest.fixture(scope="module")
def folder(tmp_path_factory):
    """An offline run of the forecourt, and an online one beside it."""
    out = tmp_path_factory.mktemp("runs")
    assert run(["associate", str(SAMPLE), "--offline", "--out", str(out / "offline")]) == 0
    assert run(["associate", str(SAMPLE), "--out", str(out / "online")]) == 0
    return out


def table(path):
    return list(csv.DictReader(path.open(encoding="utf-8")))


def test_the_engines_own_tracks_are_kept_as_they_were(folder):
    for kind in ("csv", "parquet"):
        kept = (folder / "offline" / f"tracks_online.{kind}").read_bytes()
        assert kept == (folder / "online" / f"tracks.{kind}").read_bytes()
    for name in ("events.csv", "decisions.parquet", "predictions.parquet", "detections.parquet"):
        own = (folder / "offline" / name).read_bytes()
        assert own == (folder / "online" / name).read_bytes()
    assert not (folder / "online" / "tracks_online.parquet").exists()


def test_every_row_says_which_track_it_was(folder):
    rows = pq.read_table(folder / "offline" / "tracks.parquet").to_pylist()
    online = pq.read_table(folder / "offline" / "tracks_online.parquet").to_pylist()
    own = {(row["frame"], row["line"]): row["track"] for row in online if row["line"] is not None}
    seen = [row for row in rows if row["line"] is not None]
    assert len(seen) == len(own)
    assert all(own[row["frame"], row["line"]] == row["online_track"] for row in seen)
    assert all(row["online_track"] is None for row in rows if row["line"] is None)
    keys = [(row["frame"], row["track"]) for row in rows]
    assert keys == sorted(set(keys))


def test_links_explain_the_identities(folder):
    links = table(folder / "offline" / "links.csv")
    facts = json.loads((folder / "offline" / "run.json").read_text())["hindsight"]
    made = [row for row in links if row["decision"] == "linked"]
    assert len(made) == facts["links_made"] > 0
    assert len(links) == facts["candidate_links"]
    for row in links:
        joined = row["object_before"] == row["object_after"]
        if row["decision"] == "linked":
            assert joined
            assert row["earlier"] != row["later"]
            assert float(row["margin"]) >= Settings().hindsight.link_margin
        elif row["decision"] == "joined again":
            assert joined
            assert row["earlier"] == row["later"]
        elif row["decision"] == "too doubtful":
            assert float(row["margin"]) < Settings().hindsight.link_margin
        else:
            assert row["margin"] == ""
            assert float(row["force_cost"]) >= 0.0
        assert int(row["last_frame"]) < int(row["first_frame"])
    assert facts["objects"] == facts["pieces"] - facts["links_made"] - facts["joined_again"]
    rows = read_run(folder / "offline")
    assert len(np.unique(rows.track)) == facts["objects"]
    assert len(rows) == facts["track_rows"]
    assert rows.reported.sum() == facts["reported_rows"]


def test_the_python_call_gives_the_same_rows(folder):
    log = read_log(SAMPLE)
    tracks, own = track_log(log, offline=True), read_run(folder / "offline")
    assert np.array_equal(tracks.track, own.track)
    assert np.array_equal(tracks.frame, own.frame)
    np.testing.assert_allclose(tracks.z, own.z, atol=1e-9)  # files speak of left and top
    assert np.array_equal(tracks.reported, own.reported)


def test_looking_back_scores_better(folder, capsys):
    scores = {}
    for name in ("online", "offline"):
        code = run(["evaluate", str(folder / name), "--truth", str(SAMPLE / "truth.csv"), "--json"])
        assert code == 0
        scores[name] = json.loads(capsys.readouterr().out)["overall"]
    assert scores["offline"]["idf1"] > scores["online"]["idf1"] + 0.05
    assert scores["offline"]["mota"] > scores["online"]["mota"]


def test_causes_are_those_of_the_engines_tracks(folder, capsys):
    truth = read_truth(SAMPLE)
    one = diagnose(folder / "offline", truth)
    other = diagnose(folder / "online", truth)
    assert one.findings == other.findings
    truth_file = str(SAMPLE / "truth.csv")
    assert run(["evaluate", str(folder / "offline"), "--truth", truth_file, "--causes"]) == 0
    assert "causes are those of the engine's own tracks" in capsys.readouterr().err


def test_a_track_is_explained_under_either_name(folder):
    offline = folder / "offline"
    rows = pq.read_table(offline / "tracks.parquet").to_pylist()
    live = {}
    for row in pq.read_table(offline / "predictions.parquet").to_pylist():
        live.setdefault(row["frame"], set()).add(row["track"])
    row = next(
        row
        for row in rows
        if row["online_track"] in live.get(row["frame"], ())
        and row["track"] not in live[row["frame"]]
    )
    told = explain(offline, row["frame"], track=row["track"])
    assert told.track == row["online_track"]
    assert f"object {row['track']}; the engine called it {row['online_track']}" in told.text()
    own = explain(offline, row["frame"], track=row["online_track"])
    assert own.track == row["online_track"]
    assert f"In hindsight this is object {row['track']}" in own.text()
    plain = explain(folder / "online", row["frame"], track=row["online_track"])
    assert own.decisions == plain.decisions
    assert own.history == plain.history
    assert "hindsight" not in plain.text()


def test_the_same_bytes_for_any_number_of_workers(tmp_path):
    for name in ("a", "b"):
        (tmp_path / name).mkdir()
        shutil.copy(SAMPLE / "detections.csv", tmp_path / f"{name}.csv")
    logs = [str(tmp_path / "a.csv"), str(tmp_path / "b.csv")]
    for workers in ("1", "2"):
        out = str(tmp_path / f"w{workers}")
        assert run(["associate", *logs, "--offline", "--out", out, "--workers", workers]) == 0
    names = [path.name for path in (tmp_path / "w1" / "a").iterdir()]
    assert {"links.csv", "tracks.parquet", "tracks_online.csv"} <= set(names)
    for name in names:
        if name != "timings.json":
            one, other = (tmp_path / w / "b" / name for w in ("w1", "w2"))
            assert one.read_bytes() == other.read_bytes(), name


def test_a_log_without_tracks(tmp_path, capsys):
    log = tmp_path / "log.csv"
    log.write_text("frame,left,top,width,height\n1,1,2,3,4\n5,80,2,3,4\n")
    assert run(["associate", str(log), "--offline", "--out", str(tmp_path / "run")]) == 0
    assert "in hindsight 0 objects" in capsys.readouterr().err
    assert table(tmp_path / "run" / "links.csv") == []
    assert table(tmp_path / "run" / "tracks.csv") == []
    assert len(read_run(tmp_path / "run")) == 0


def test_a_model_that_cannot_look_back_is_said_before_anything_is_run(tmp_path, monkeypatch):
    monkeypatch.delattr(ConstantVelocity, "transition")
    with pytest.raises(SettingsError, match="cannot look back"):
        track_log(log_of([1, 2], [[0.0, 0.0]] * 2), offline=True)
    log = tmp_path / "log.csv"
    log.write_text("frame,x,y\n1,1,2\n2,1,2\n")
    assert run(["associate", str(log), "--offline", "--out", str(tmp_path / "run")]) == 2
    assert not (tmp_path / "run").exists()


def test_gaps_are_reported_only_where_they_are_short_and_well_known():
    log = read_log(SAMPLE)

    def filled(*overrides):
        chosen = load_settings(None, overrides)
        collector, born = collected(log, chosen)
        found = look_back(log, collector, chosen, born)
        rows, _ = rows_in_hindsight(log, found, chosen)
        between = rows.line < 0
        return rows, between

    rows, between = filled()
    assert between.sum() > 200
    everything = rows.reported[between].sum()
    assert filled("hindsight.fill_seconds=0")[0].reported[between].sum() == 0
    short, _ = filled("hindsight.fill_seconds=0.3")
    known, _ = filled("hindsight.fill_spread=0.8")
    assert 0 < short.reported[between].sum() < everything
    assert 0 < known.reported[between].sum() < everything
    assert short.reported[~between].all()
    spread = known.covariance[:, 0]
    assert spread[between & known.reported].max() < spread[between & ~known.reported].max()
