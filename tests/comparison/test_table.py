"""A comparison as text."""

from __future__ import annotations

import pytest

from tests.evaluation.made import random_scene
from tracker.comparison import ChangedSetting, Difference, Parting, compare
from tracker.comparison.table import (
    LISTED,
    changes_table,
    explain_commands,
    objects_table,
    partings_text,
    sequences_table,
    settings_table,
)


@pytest.fixture
def runs(tmp_path):
    """Two run folders with a ledger, of names that a shell would split."""
    for name in ("old run", "new"):
        (tmp_path / name).mkdir()
        (tmp_path / name / "decisions.parquet").touch()
    return tmp_path / "old run", tmp_path / "new"


def parting(*differences):
    return Parting(7, 0.5, differences, "line", None, None)


IDENTITY = Difference("identity", 3, 4, 55, (1.0, 2.0), known_a=3, known_b=9)


@pytest.mark.parametrize(
    ("difference", "wanted"),
    [
        (IDENTITY, ("--line 55", "--line 55")),
        (Difference("only-a", 3, None, 55, (1.0, 2.0)), ("--track 3", "--line 55")),
        (Difference("only-b", None, 4, 55, (1.0, 2.0)), ("--line 55", "--track 4")),
        (Difference("only-b", None, 4, None, (1.0, 2.0)), (None, "--track 4")),
        (Difference("identity", 3, 4, None, (1.0, 2.0)), ("--track 3", "--track 4")),
    ],
)
def test_commands(runs, difference, wanted):
    old, new = runs
    starts = (f"margent explain '{old}' --frame 7 ", f"margent explain {new} --frame 7 ")
    assert explain_commands(parting(difference), runs) == [
        start + about for start, about in zip(starts, wanted, strict=True) if about
    ]


def test_no_command_without_a_ledger(runs):
    (runs[0] / "decisions.parquet").unlink()
    (only,) = explain_commands(parting(IDENTITY), runs)
    assert str(runs[1]) in only
    assert explain_commands(Parting(None, None, (), "line", None, None), runs) == []


def test_many_sequences_and_differences_are_cut_short(runs):
    found = compare(
        {f"s{seed}": (a, a, truth) for seed in range(7) for a, truth in [random_scene(seed)]},
        resamples=100,
    )
    many = parting(*[IDENTITY] * (LISTED + 3))
    found.partings.update(dict.fromkeys(found.partings, many))
    text = partings_text(found, dict.fromkeys(found.partings, runs))
    assert text.count("the runs part in frame 7 (0.500 s)") == LISTED
    assert text.count("and 3 more (--json has all)") == LISTED
    assert "and in 2 more sequences" in text


def test_places(runs):
    a, truth = random_scene(1)
    found = compare({"quay": (a, a, truth)}, resamples=100)
    found.partings["quay"] = Parting(None, None, (), "place", 4, 0.25)
    text = partings_text(found, {"quay": runs})
    assert "quay: both runs report the same rows and identities" in text
    assert "differ from frame 4 on, there by up to 0.25" in text


def test_settings():
    assert settings_table([], 3) == "settings: the same in both runs"
    text = settings_table(
        [
            ChangedSetting("gate.probability", 0.9, None, ("a", "b", "c")),
            ChangedSetting("cost.terms", ["overlap"] * 9, 1, ("b",)),
        ],
        3,
    ).splitlines()
    assert text[1].split() == ["gate.probability", "0.9", "-"]
    assert text[2].endswith("…  1  b")


def test_tables_fit_100_columns():
    sequences = {}
    for seed in range(8):
        tracks, truth = random_scene(seed, frames=60, objects=20)
        other, _ = random_scene(seed + 50, frames=60, objects=20)
        sequences[f"forecourt-{seed:05d}"] = (tracks, other, truth)
    found = compare(sequences, resamples=100)
    for text in (changes_table(found), sequences_table(found), objects_table(found, 20)):
        assert max(map(len, text.splitlines())) <= 100
    assert len(objects_table(found, 20).splitlines()) == 23
    assert len(objects_table(found, 0).splitlines()) == 1
