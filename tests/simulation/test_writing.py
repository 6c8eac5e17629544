"""Folders: complete or not at all, and nobody's own log is overwritten."""

from __future__ import annotations

import tomllib

import pytest

from tests.simulation.pairs import settings
from tracker.errors import OutputError
from tracker.simulation import SimulatedSequence, simulate, write_sequence
from tracker.simulation.tables import csv_bytes, rounded


@pytest.fixture(scope="module")
def sequence() -> SimulatedSequence:
    return simulate("yard", seed=1, settings=settings("yard", "clock.seconds=1"))


def test_the_folder_says_how_it_was_made(sequence, tmp_path):
    write_sequence(sequence, tmp_path / "yard")
    facts = tomllib.loads((tmp_path / "yard" / "sequence.toml").read_text(encoding="utf-8"))
    assert facts["name"] == "yard"
    assert facts["frame_rate_hz"] == 10
    assert facts["frames"] == 10
    assert facts["sensor"] == "roof lidar"
    how = facts["simulated"]
    assert how["command"] == "margent simulate yard --seed 1 --set clock.seconds=1.0"
    assert (how["scene"], how["seed"]) == ("yard", 1)
    assert "invented" in how["note"]
    assert "radians" in how["units"]


def test_an_earlier_simulation_is_replaced_whole(sequence, tmp_path):
    folder = tmp_path / "out"
    write_sequence(simulate("sway", seed=1, settings=settings("sway", "clock.seconds=1")), folder)
    write_sequence(sequence, folder)
    assert sorted(item.name for item in folder.iterdir()) == [
        "detections.csv", "detections_oriented.csv", "sequence.toml", "truth.csv",
        "truth_oriented.csv",
    ]  # fmt: skip
    assert [item.name for item in tmp_path.iterdir()] == ["out"]  # nothing temporary is left


@pytest.mark.parametrize("facts", ['name = "mine"\n', "not toml = = "])
def test_a_log_of_ones_own_is_not_replaced(sequence, tmp_path, facts):
    (tmp_path / "sequence.toml").write_text(facts, encoding="utf-8")
    (tmp_path / "detections.csv").write_text("frame,x,y\n", encoding="utf-8")
    with pytest.raises(OutputError, match="a log that was not simulated"):
        write_sequence(sequence, tmp_path)
    assert (tmp_path / "detections.csv").read_text(encoding="utf-8") == "frame,x,y\n"


def test_other_things_in_the_folder_are_not_lost(sequence, tmp_path):
    write_sequence(sequence, tmp_path / "yard")
    (tmp_path / "yard" / "notes.txt").write_text("mine", encoding="utf-8")
    with pytest.raises(OutputError, match=r"no simulation wrote \(notes.txt\)"):
        write_sequence(sequence, tmp_path / "yard")
    write_sequence(sequence, tmp_path / "yard", replacing={"notes.txt"})
    assert not (tmp_path / "yard" / "notes.txt").exists()


def test_a_file_in_the_way_is_named(sequence, tmp_path):
    (tmp_path / "yard").write_text("", encoding="utf-8")
    with pytest.raises(OutputError, match="is a file, not a folder"):
        write_sequence(sequence, tmp_path / "yard")


def test_numbers_are_short_and_zero_has_no_sign():
    import numpy as np

    values = rounded(np.array([-0.001, 2.0, 1.005, 12.3456]), 2)
    assert csv_bytes({"a": values}) == b"a\n0\n2\n1\n12.35\n"
