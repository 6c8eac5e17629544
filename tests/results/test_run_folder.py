"""Run folders: complete, atomic, the same bytes again, and true to the engine."""

import csv
import errno
import json

import numpy as np
import pyarrow.parquet as pq
import pytest

from tracker import load_settings, read_log, read_run, track_log
from tracker.errors import InputError, OutputError
from tracker.log import read_track_file
from tracker.offline import associate_log
from tracker.results import TrackState, read_facts
from tracker.results.write import RunWriter

FILES = {
    "tracks.csv",
    "tracks.parquet",
    "events.csv",
    "decisions.parquet",
    "predictions.parquet",
    "detections.parquet",
    "rejected.csv",
    "settings.toml",
    "run.json",
    "timings.json",
}
HEADER = "frame,left,top,width,height,score,label\n"


@pytest.fixture
def log(tmp_path):
    """Two people and a cart, a gap, a bad row, a label that needs quotes."""
    rows = []
    for frame in range(1, 41):
        rows.append(f'{frame},{10 + 2 * frame},20,30,60,0.9,"cart, ""big"""')
        if not 15 <= frame <= 19:
            rows.append(f"{frame},{300 - 2 * frame},25,30,60,0.8,person")
        if frame == 25:
            rows.append(f"{frame},500,500,30,60,0.4,person")
    rows.append("41,x,20,30,60,0.9,person")
    path = tmp_path / "detections.csv"
    path.write_text(HEADER + "\n".join(rows) + "\n")
    return read_log(path, frame_rate_hz=10)


def table(path):
    return list(csv.DictReader(path.open(encoding="utf-8", newline="")))


def test_the_folder_is_complete_and_says_what_happened(log, tmp_path):
    facts = associate_log(log, load_settings(), tmp_path / "run")
    assert {path.name for path in (tmp_path / "run").iterdir()} == FILES
    assert read_facts(tmp_path / "run") == json.loads(json.dumps(facts))
    assert facts["counts"]["frames"] == 40
    assert facts["counts"]["rejected_rows"] == 1
    assert facts["counts"]["tracks_confirmed"] == 2
    assert facts["certificate"]["largest_gap"] < 1e-12
    assert facts["input"]["sha256"] == log.digest
    (rejected,) = table(tmp_path / "run" / "rejected.csv")
    assert rejected["line"] == str(len(log) + 2)
    assert "41,x,20" in rejected["text"]


def test_tracks_csv_reads_back_with_every_reader(log, tmp_path):
    associate_log(log, load_settings(), tmp_path / "run")
    rows = table(tmp_path / "run" / "tracks.csv")
    assert {row["label"] for row in rows} == {'cart, "big"', "person"}
    own = read_run(tmp_path / "run")
    file = read_track_file(tmp_path / "run" / "tracks.csv")
    memory = track_log(log)
    for tracks in (file, memory):
        assert tracks.track.tolist() == own.track.tolist()
        assert tracks.frame.tolist() == own.frame.tolist()
        assert tracks.reported.tolist() == own.reported.tolist()
        assert tracks.state.tolist() == own.state.tolist()
        np.testing.assert_allclose(tracks.z, own.z, atol=2e-3)


def test_events_replayed_give_the_states_of_the_rows(log, tmp_path):
    associate_log(log, load_settings(), tmp_path / "run")
    events = table(tmp_path / "run" / "events.csv")
    state = {}
    at = 0
    rows = table(tmp_path / "run" / "tracks.csv")
    confirmed = {row["track"] for row in rows}
    for row in rows:
        while at < len(events) and int(events[at]["frame"]) <= int(row["frame"]):
            event = events[at]
            assert event["from"] == state.get(event["track"], "")
            state[event["track"]] = event["to"]
            at += 1
        assert state[row["track"]] == row["state"]
    assert {event["track"] for event in events} > confirmed  # clutter is in the events only


@pytest.mark.parametrize(
    ("override", "expected"),
    [
        ("output.report_coasting_seconds=0", {"tentative": 1, "confirmed": 1, "coasting": 0}),
        ("output.report_coasting_seconds=9", {"tentative": 1, "confirmed": 1, "coasting": 1}),
        (
            "output.report_before_confirmation=false",
            {"tentative": 0, "confirmed": 1, "coasting": 0},
        ),
    ],
)
def test_what_is_reported(log, tmp_path, override, expected):
    associate_log(log, load_settings(None, (override,)), tmp_path / "run")
    for row in table(tmp_path / "run" / "tracks.csv"):
        assert int(row["reported"]) == expected[row["state"]]


def test_coasting_is_reported_up_to_its_limit(log, tmp_path):
    chosen = load_settings(None, ("output.report_coasting_seconds=0.2",))
    associate_log(log, chosen, tmp_path / "run")
    coasting = [row for row in table(tmp_path / "run" / "tracks.csv") if row["state"] == "coasting"]
    reported = {int(row["frame"]) for row in coasting if row["reported"] == "1"}
    assert reported == {15, 16}  # unseen from frame 15 on, ten frames a second
    assert len(coasting) == 5


@pytest.mark.parametrize("position", ["detected", "estimated"])
def test_what_position_is_shown(log, tmp_path, position):
    associate_log(log, load_settings(None, (f"output.position={position}",)), tmp_path / "run")
    shown = pq.read_table(tmp_path / "run" / "tracks.parquet").to_pydict()
    place = {line: k for k, line in enumerate(log.line.tolist())}
    apart = []
    for line, left, width, estimate in zip(
        shown["line"], shown["left"], shown["width"], shown["estimate"], strict=True
    ):
        if line is not None:
            centre = left + width / 2
            apart.append(abs(centre - log.z[place[line], 0]))
            if position == "estimated":
                assert centre == pytest.approx(estimate[0])
    assert (max(apart) < 1e-9) == (position == "detected")


def test_the_same_input_and_settings_give_the_same_bytes(log, tmp_path):
    for name in ("a", "b"):
        associate_log(log, load_settings(), tmp_path / name)
    for name in FILES - {"timings.json"}:
        assert (tmp_path / "a" / name).read_bytes() == (tmp_path / "b" / name).read_bytes(), name


def test_an_earlier_run_is_replaced_other_things_are_not(log, tmp_path):
    out = tmp_path / "run"
    associate_log(log, load_settings(), out)
    associate_log(log, load_settings(None, ("ledger.level=none",)), out)
    assert "decisions.parquet" not in {path.name for path in out.iterdir()}
    other = tmp_path / "notes"
    other.mkdir()
    (other / "diary.txt").write_text("dear diary")
    with pytest.raises(OutputError, match="other things in it"):
        associate_log(log, load_settings(), other)
    assert (other / "diary.txt").read_text() == "dear diary"
    with pytest.raises(OutputError, match="is a file"):
        associate_log(log, load_settings(), other / "diary.txt")


@pytest.mark.parametrize("code", [errno.ENOSPC, errno.EROFS, errno.EACCES])
def test_a_failing_write_leaves_nothing_behind(log, tmp_path, monkeypatch, code):
    def fail(self, facts):
        import os

        raise OSError(code, os.strerror(code))

    monkeypatch.setattr(RunWriter, "finish", fail)
    before = {path.name for path in tmp_path.iterdir()}
    with pytest.raises(OutputError, match=r"cannot be written.*nothing is left behind"):
        associate_log(log, load_settings(), tmp_path / "run")
    assert {path.name for path in tmp_path.iterdir()} == before


def test_what_is_no_run_is_refused(tmp_path):
    with pytest.raises(InputError, match="is not a run folder"):
        read_run(tmp_path)
    (tmp_path / "run.json").write_text("{")
    with pytest.raises(InputError, match="cannot be read"):
        read_run(tmp_path)


def test_a_log_without_confirmed_tracks_still_makes_a_run(tmp_path):
    path = tmp_path / "one.csv"
    path.write_text(HEADER + "1,0,0,10,20,0.9,person\n")
    associate_log(read_log(path, frame_rate_hz=10), load_settings(), tmp_path / "run")
    assert {path.name for path in (tmp_path / "run").iterdir()} == FILES
    assert len(read_run(tmp_path / "run")) == 0


def test_absent_frames_may_count_as_scanned(tmp_path):
    path = tmp_path / "gap.csv"
    rows = [f"{frame},0,0,10,20,0.9,person" for frame in (1, 2, 3, 4, 9, 10)]
    path.write_text(HEADER + "\n".join(rows) + "\n")
    log = read_log(path, frame_rate_hz=10)
    plain = track_log(log)
    assert plain.frame.tolist() == [1, 2, 3, 4, 9, 10]
    scanned = track_log(log, load_settings(None, ("time.absent_frames=scanned",)))
    assert scanned.frame.tolist() == list(range(1, 11))
    assert (scanned.state == TrackState.COASTING).sum() == 4
    np.testing.assert_allclose(scanned.time, np.arange(1, 11) / 10)


def test_detections_below_the_score_floor_are_not_used(log, tmp_path):
    facts = associate_log(log, load_settings(None, ("sensor.score_floor=0.85",)), tmp_path / "run")
    assert facts["counts"]["detections_below_score_floor"] == 36
    assert facts["counts"]["tracks_confirmed"] == 1
