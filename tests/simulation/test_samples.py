"""The committed sample sequences are what their commands make, byte for byte."""

from __future__ import annotations

import re
import shlex
import tomllib
from pathlib import Path

import pytest

from tracker.cli.main import run
from tracker.simulation import SCENES

SAMPLES = Path(__file__).parents[2] / "sample_sequences"
# A later version of the software that makes the same bytes need not touch the samples.
VERSION = re.compile(rb'^version = ".*"$', re.MULTILINE)


def test_there_is_one_sample_a_scene_and_they_are_small():
    folders = {item.name for item in SAMPLES.iterdir() if item.is_dir()}
    assert folders == set(SCENES)
    assert sum(file.stat().st_size for file in SAMPLES.rglob("*.*")) < 1_000_000


@pytest.mark.parametrize("scene", list(SCENES))
def test_a_sample_is_what_its_command_makes(scene, tmp_path):
    folder = SAMPLES / scene
    facts = tomllib.loads((folder / "sequence.toml").read_text(encoding="utf-8"))
    command = facts["simulated"]["command"]
    assert command in (SAMPLES / "README.md").read_text(encoding="utf-8")
    assert run([*shlex.split(command)[1:], "--out", str(tmp_path / scene)]) == 0
    again = {item.name: item.read_bytes() for item in (tmp_path / scene).iterdir()}
    committed = {item.name: item.read_bytes() for item in folder.iterdir()}
    assert sorted(again) == sorted(committed)
    for name, data in committed.items():
        assert VERSION.sub(b"", data) == VERSION.sub(b"", again[name]), name
