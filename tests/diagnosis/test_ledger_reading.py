"""Reading parts of a run, and runs that are damaged."""

from __future__ import annotations

import json
import shutil

import pyarrow.parquet as pq
import pytest

from tests.diagnosis.runs import CROSSING, crossing, made_log, made_run
from tracker.diagnosis import explain
from tracker.diagnosis.ledger_reading import RunLedger
from tracker.errors import InputError, SettingsError


@pytest.fixture
def copied(crossing_run, tmp_path):
    return shutil.copytree(crossing_run, tmp_path / "copy")


@pytest.fixture(scope="module")
def in_pieces(tmp_path_factory):
    """The crossing with a row group every few rows, as a large run has every 65,536."""
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr("tracker.ledger.ROW_GROUP", 5)
        return made_run(tmp_path_factory.mktemp("pieces") / "run", crossing(), *CROSSING)


def test_pieces_read_as_one(in_pieces, crossing_run):
    facts = pq.read_metadata(in_pieces / "predictions.parquet")
    assert facts.num_row_groups > 5, "else the test is none"
    for frame in (1, 10, 14, 16, 20):
        one, other = (explain(run, frame).as_dict() for run in (in_pieces, crossing_run))
        assert one | {"folder": ""} == other | {"folder": ""}
    asked = [explain(run, 10, track=1).as_dict() for run in (in_pieces, crossing_run)]
    assert asked[0] | {"folder": ""} == asked[1] | {"folder": ""}


def test_only_the_row_groups_with_the_frame_are_read(in_pieces, monkeypatch):
    read = []
    original = pq.ParquetFile.read_row_group

    def noted(self, number, *arguments, **names):
        read.append(number)
        return original(self, number, *arguments, **names)

    monkeypatch.setattr(pq.ParquetFile, "read_row_group", noted)
    ledger = RunLedger(in_pieces)
    assert ledger.frames_around(10, 2, 3) == ([8, 9], [11, 12, 13])
    groups = pq.read_metadata(in_pieces / "predictions.parquet").num_row_groups
    assert len(read) < groups
    assert set(ledger.rows("decisions", 10, 10)["frame"].to_pylist()) == {10}


def test_frames_around_the_ends(crossing_run):
    ledger = RunLedger(crossing_run)
    assert ledger.frames_around(1, 3, 2) == ([], [2, 3])
    assert ledger.frames_around(20, 3, 2) == ([17, 18, 19], [])
    assert ledger.frames_around(20, 0, 0) == ([], [])
    assert ledger.frames_around(2, 99, 0) == ([1], [])
    assert ledger.first_and_last() == (1, 20)


def test_frame_numbers_with_gaps(tmp_path):
    frames = {n: [(0.01 * n, 0.0)] for n in (7, 10_000, 10_003, 2_000_000_000)}
    log = made_log(frames)
    ledger = RunLedger(made_run(tmp_path / "run", log, "lifecycle.coast_seconds=1e12"))
    assert ledger.frames_around(10_003, 6, 6) == ([7, 10_000], [2_000_000_000])


def test_not_a_run(tmp_path):
    with pytest.raises(InputError, match="is not a run folder"):
        explain(tmp_path, 1)


@pytest.mark.parametrize(
    "name", ["decisions.parquet", "predictions.parquet", "detections.parquet", "tracks.parquet"]
)
def test_missing_and_damaged_files(copied, name):
    path = copied / name
    path.write_bytes(b"PAR1 nothing of the kind")
    with pytest.raises(InputError, match=f"{name}: cannot be read as part of a run"):
        explain(copied, 10, track=1)
    path.unlink()
    with pytest.raises(InputError, match=f"{name}: is missing from the run folder"):
        explain(copied, 10, track=1)


def test_other_damage(copied):
    (copied / "events.csv").write_text("frame,what\n1,2\n", "utf-8")
    with pytest.raises(InputError, match=r"events\.csv"):
        explain(copied, 10, track=1)
    (copied / "events.csv").unlink()
    with pytest.raises(InputError, match=r"events\.csv"):
        explain(copied, 10)
    (copied / "run.json").write_text("{}", "utf-8")
    with pytest.raises(InputError, match=r"run\.json: is not what this version writes"):
        explain(copied, 10)


def test_columns_of_another_version(copied):
    path = copied / "predictions.parquet"
    pq.write_table(pq.read_table(path).drop_columns(["covariance"]), path)
    with pytest.raises(InputError, match="covariance"):
        explain(copied, 10)


def test_settings_of_another_version(copied):
    path = copied / "settings.toml"
    path.write_text(path.read_text("utf-8") + "\n[time]\nnew_thing = 1\n", "utf-8")
    with pytest.raises((InputError, SettingsError)):
        explain(copied, 10)


def test_a_run_without_frames(copied):
    facts = json.loads((copied / "run.json").read_text("utf-8"))
    facts["counts"]["frames"] = 0
    (copied / "run.json").write_text(json.dumps(facts), "utf-8")
    with pytest.raises(InputError, match="has no frames"):
        explain(copied, 10)


def test_rejected_lines_are_told(copied):
    text = 'line,column,reason,text\n33,x,"not a number","8,""a\nb"",2"\n'
    (copied / "rejected.csv").write_text(text, "utf-8")
    with pytest.raises(InputError, match="That line is in frame 16"):
        explain(copied, 10, line=33)
    (copied / "rejected.csv").write_text(text.replace("33,", "99,"), "utf-8")
    with pytest.raises(InputError, match="That line was rejected: not a number"):
        explain(copied, 10, line=99)


def test_files_of_two_runs(campus_runs, tmp_path):
    """A narrower gate in settings.toml than the run had: what was chosen contradicts it."""
    run = shutil.copytree(campus_runs["contested"], tmp_path / "run")
    path = run / "settings.toml"
    path.write_text(path.read_text("utf-8").replace("probability = 0.999", "probability = 0.001"))
    with pytest.raises(InputError, match="chosen pairs outside the gate"):
        explain(run, 5)
