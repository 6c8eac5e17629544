"""Lengths, delays, gaps and identity recovery of small cases by hand."""

from __future__ import annotations

import numpy as np
import pytest

from tests.evaluation.made import make_tracks, make_truth, standing
from tracker.evaluation import evaluate, evaluate_all


def durations(word, annotated=None):
    """Of one object whose frames are paired with the track of that digit, or none (dot)."""
    rows = []
    for frame, letter in enumerate(word, 1):
        if letter != ".":
            rows += standing([frame], int(letter))
    truth = make_truth(standing(annotated or range(1, len(word) + 1), 7))
    return {
        name: sorted(values.tolist())
        for name, values in evaluate(make_tracks(rows), truth).durations.values.items()
    }


def test_delay_and_gaps():
    found = durations("...11..1.111.")
    assert found["frames_to_first_match"] == [3]
    assert found["gap_frames"] == [1, 2]
    assert found["track_frames"] == [6]
    assert found["identity_recovered_frames"] == [1, 2]
    assert found["identity_lost_frames"] == [1]


def test_identity_that_comes_back():
    found = durations("1111..2211")
    assert found["gap_frames"] == [2]
    assert found["identity_recovered_frames"] == [4]
    assert found["identity_lost_frames"] == []
    assert found["track_frames"] == [2, 6]


def test_identity_that_does_not():
    found = durations("111122")
    assert found["identity_recovered_frames"] == []
    assert found["identity_lost_frames"] == [2]


def test_frames_without_annotation_do_not_count():
    assert durations("11..11", annotated=[1, 2, 5, 6])["gap_frames"] == []


def test_an_object_never_found_has_no_delay():
    found = durations("....")
    assert found["frames_to_first_match"] == []
    assert found["identity_lost_frames"] == []


def test_objects_are_kept_apart():
    rows = standing([1, 4], 1) + standing([3], 2, left=100.0)
    truth = make_truth(standing([1, 4], 7) + standing([1, 3], 8, left=100.0))
    values = evaluate(make_tracks(rows), truth).durations.values
    assert values["gap_frames"].tolist() == []
    assert sorted(values["frames_to_first_match"].tolist()) == [0, 1]


def test_summary_over_sequences():
    def sequence(first):
        return make_tracks(standing(range(first, 11), 1)), make_truth(standing(range(1, 11), 7))

    overall = evaluate_all({str(k): sequence(k) for k in (1, 2, 6)}).overall
    found = overall.durations.summary()["frames_to_first_match"]
    assert found == {
        "count": 3, "mean": 2.0, "median": 1.0, "p90": pytest.approx(4.2), "largest": 5,
    }  # fmt: skip
    assert overall.as_dict()["durations"]["gap_frames"]["median"] is None
    assert np.isfinite(found["mean"])
