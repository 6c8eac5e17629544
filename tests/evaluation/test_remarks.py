"""What is said beside the scores, and tables that fit a terminal."""

from __future__ import annotations

from dataclasses import replace

import pytest

from tests.evaluation.made import make_tracks, make_truth, random_scene, standing
from tracker.evaluation import Evaluation, Scope, evaluate, evaluate_all
from tracker.evaluation.remarks import LISTED, remarks, told_once
from tracker.evaluation.table import details_table, scores_table
from tracker.log import Kind, Rejection
from tracker.log.model import Truth

TRACKS = make_tracks(standing([1, 2], 1))


def said(truth: Truth, scope: Scope | None = None) -> str:
    scope = scope or Scope()
    return "\n".join(remarks(truth, scope, evaluate(TRACKS, truth, scope)))


def test_nothing_to_say():
    assert said(make_truth(standing([1, 2], 7))) == ""


def test_notes_of_the_reader_are_passed_on():
    assert "note: rows sorted" in said(make_truth(standing([1], 7), notes=("rows sorted",)))


def test_rejected_rows_are_listed_up_to_a_few():
    rows = tuple(Rejection(line, "left", "not a number", f"row {line}") for line in range(2, 9))
    text = said(make_truth(standing([1, 2], 7), rejections=rows))
    assert "7 rows of truth.csv rejected and not scored (--strict stops instead):" in text
    assert text.count("not a number") == LISTED
    assert "line 2, column 'left': not a number (found 'row 2')" in text
    assert "and 2 more" in text


def benchmark(word: str) -> Truth:
    return make_truth(standing([1, 2], 7), words=[word, word], format="benchmark")


def test_the_default_of_the_benchmark_layout_is_said():
    text = said(benchmark("1"))
    assert "class 1 is scored and classes 2, 7, 8, 12 are ignored" in text
    assert "--score-class" in text
    assert said(benchmark("1"), Scope(classes_scored=("1",))) == ""


def test_nothing_scored_is_said():
    text = said(benchmark("3"))
    assert "no row of the truth is scored (its classes: 3)" in text
    assert "--score-class" in text


def test_no_match_is_said():
    assert "no track is ever on an object" in said(make_truth(standing([1, 2], 7, left=500.0)))


@pytest.mark.parametrize(
    ("given", "told"),
    [
        ({}, []),
        ({"a": ["x", "y"]}, ["a: x", "a: y"]),
        ({"a": ["x", "y"], "b": ["x"]}, ["all sequences: x", "a: y"]),
        ({"a": ["x"], "b": []}, ["a: x"]),
    ],
)
def test_what_is_said_of_all_is_said_once(given, told):
    assert list(told_once(given)) == told


@pytest.fixture(scope="module")
def mixed() -> Evaluation:
    return evaluate_all(
        {str(kind): random_scene(1, kind=kind) for kind in Kind}, Scope(distance_threshold=9.0)
    )


DISTANCES = ("motp", "gospa", "gospa_localisation", "gospa_missed", "gospa_false", "ospa",
             "ospa_localisation", "ospa_cardinality")  # fmt: skip


def test_boxes_and_points_together_have_no_mean_distance(mixed):
    overall = mixed.overall.as_dict()
    assert [overall[name] for name in DISTANCES] == [None] * len(DISTANCES)
    assert overall["matches"] == sum(s.counts.matches for s in mixed.sequences.values())
    assert overall["mota"] is not None
    for scores in mixed.sequences.values():
        assert None not in [scores.as_dict()[name] for name in DISTANCES]


def test_tables_fit_100_columns():
    # Perfect tracks have the widest ratios, a million rows the widest counts.
    scores = evaluate(TRACKS, make_truth(standing([1, 2], 7)))
    counts = replace(
        scores.counts, objects=1_000_000, truth_boxes=1_000_000, track_boxes=1_000_000,
        matches=1_000_000, false_positives=100_000, misses=100_000,
    )  # fmt: skip
    large = replace(scores, counts=counts)
    found = Evaluation({"a-name-of-twenty-chr": large, "b": large}, {"person": large})
    for text in (scores_table(found), details_table(found)):
        assert max(map(len, text.splitlines())) <= 100
        assert len(text.split("\n\n")) == 2
