"""`margent evaluate --causes` end to end on the sample sequences."""

import csv
import json
from pathlib import Path

import pytest

from tracker.cli.main import run

SAMPLES = Path(__file__).resolve().parent.parent.parent / "sample_sequences"


@pytest.fixture
def rush(tmp_path):
    def associate(*options):
        folder = tmp_path / "rush"
        assert run(["associate", str(SAMPLES / "rush"), "--out", str(folder), *options]) == 0
        return folder

    return associate


def test_summary_and_file(rush, capsys):
    folder = rush()
    truth = str(SAMPLES / "rush" / "truth.csv")
    assert run(["evaluate", str(folder), "--truth", truth, "--causes"]) == 0
    told = capsys.readouterr().out
    assert "Causes of the errors of rush" in told
    assert "would have admitted" in told
    rows = list(csv.DictReader((folder / "causes.csv").open(encoding="utf-8")))
    assert rows
    assert all(row["error"] and row["cause"] and row["words"] for row in rows)


def test_without_ledger_the_log_is_run_again(rush, capsys):
    folder = rush("--set", "ledger.level=none")
    truth = str(SAMPLES / "rush" / "truth.csv")
    asked = ["evaluate", str(folder), "--truth", truth, "--causes", "--json"]
    assert run(asked) == 2
    assert "--log" in capsys.readouterr().err
    assert run([*asked, "--log", str(SAMPLES / "rush")]) == 0
    again = json.loads(capsys.readouterr().out)["causes"]["rush"]
    rush("--set", "ledger.level=full")
    assert run(asked) == 0
    assert json.loads(capsys.readouterr().out)["causes"]["rush"] == again
    assert run([*asked, "--log", str(SAMPLES / "fog")]) == 0  # not needed, so not looked at


def test_the_wrong_log_is_refused(rush, capsys):
    folder = rush("--set", "ledger.level=none")
    truth = str(SAMPLES / "rush" / "truth.csv")
    asked = ["evaluate", str(folder), "--truth", truth, "--causes", "--log", str(SAMPLES / "fog")]
    assert run(asked) == 2
    assert "is not the log that the run" in capsys.readouterr().err


def test_track_files_have_no_ledger(rush, capsys):
    folder = rush()
    truth = str(SAMPLES / "rush" / "truth.csv")
    assert run(["evaluate", str(folder / "tracks.csv"), "--truth", truth, "--causes"]) == 2
    assert "--causes needs run folders" in capsys.readouterr().err
