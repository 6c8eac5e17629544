"""Objects that got better or worse, by hand."""

from __future__ import annotations

import csv

from tests.evaluation.made import make_tracks, make_truth, standing
from tracker.comparison import ObjectChange, compare, worst_first, write_objects

FRAMES = range(1, 11)
TRUTH = make_truth(
    sorted(standing(FRAMES, 7) + standing(FRAMES, 8, left=100.0) + standing(FRAMES, 9, left=200.0)),
    words=["person", "cart", "person"] * 10,
)
# A: everything right, but object 9 is lost in frames 4 and 5. B: object 7 changes its track in
# frame 8, object 8 is as before under another number, object 9 is never lost.
A = make_tracks(
    sorted(
        standing(FRAMES, 1)
        + standing(FRAMES, 2, left=100.0)
        + standing([1, 2, 3, 6, 7, 8, 9, 10], 3, left=200.0)
    )
)
B = make_tracks(
    sorted(
        standing(range(1, 8), 1)
        + standing([8, 9, 10], 4)
        + standing(FRAMES, 5, left=100.0)
        + standing(FRAMES, 3, left=200.0)
    )
)


def changes():
    return compare({"quay": (A, B, TRUTH)}, resamples=100).objects


def test_by_hand():
    seven, eight, nine = changes()
    assert (seven.object, seven.label, seven.frames) == ("7", "person", 10)
    assert (seven.first_frame, seven.last_frame) == (1, 10)
    assert (seven.own_track_a, seven.own_track_b) == (10, 7)
    assert (seven.covered_a, seven.covered_b) == (10, 10)
    assert (seven.switches_a, seven.switches_b) == (0, 1)
    assert (seven.fragments_a, seven.fragments_b) == (0, 0)
    assert (seven.first_difference, seven.verdict) == (8, "worse")
    assert (eight.label, eight.verdict, eight.first_difference) == ("cart", "same", None)
    assert (nine.covered_a, nine.covered_b) == (8, 10)
    assert (nine.fragments_a, nine.fragments_b) == (1, 0)
    assert (nine.first_difference, nine.verdict) == (4, "better")


def test_greatest_loss_first_and_only_what_differs():
    assert [item.object for item in worst_first(changes())] == ["7", "9"]


def test_files(tmp_path):
    for name, delimiter in (("objects.csv", ","), ("objects.tsv", "\t")):
        write_objects(tmp_path / "new" / name, changes())
        text = (tmp_path / "new" / name).read_text("utf-8")
        rows = list(csv.DictReader(text.splitlines(), delimiter=delimiter))
        assert [row["object"] for row in rows] == ["7", "8", "9"]
        assert (rows[0]["own_track_a"], rows[0]["own_track_b"]) == ("10", "7")
        assert rows[1]["first_difference"] == ""
        assert rows[2]["verdict"] == "better"


def test_sums_over_objects_are_the_counts():
    found = compare({"quay": (A, B, TRUTH)}, resamples=100)
    for side, scores in (("a", found.a), ("b", found.b)):
        counts = scores.overall.counts
        for column, wanted in (
            ("covered", counts.matches),
            ("own_track", counts.identity_matches),
            ("switches", counts.switches),
            ("fragments", counts.fragmentations),
        ):
            assert sum(getattr(item, f"{column}_{side}") for item in found.objects) == wanted


def change(name, **counts):
    same = {"covered": 5, "own_track": 5, "switches": 1, "fragments": 1}
    values = {f"{k}_{side}": v for k, v in same.items() for side in "ab"} | counts
    return ObjectChange("s", name, "", 9, 1, 9, **values, first_difference=1)


def test_what_counts_as_worse():
    """Frames on the own track first, then frames covered, then switches, then fragments."""
    changes = [
        change("better", fragments_b=0),
        change("same"),
        change("fragments", fragments_b=2, switches_b=1),
        change("switches", switches_b=2, fragments_b=0),
        change("covered", covered_b=4, switches_b=0),
        change("own", own_track_b=4, covered_b=9),
        change("more own", own_track_b=3),
    ]
    assert [item.object for item in worst_first(changes)] == [
        "more own", "own", "covered", "switches", "fragments", "same", "better",
    ]  # fmt: skip
    verdicts = [item.verdict for item in changes]
    assert verdicts == ["better", "same", *["worse"] * 5]
