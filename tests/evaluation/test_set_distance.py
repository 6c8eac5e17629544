"""GOSPA and OSPA by hand and against their definitions."""

from __future__ import annotations

from math import sqrt

import numpy as np
import pytest

from tests.evaluation.made import make_tracks, make_truth, standing
from tests.reference import gospa as reference
from tracker.evaluation import Scope, evaluate, evaluate_all
from tracker.log import Kind


def points(frames, threshold):
    """Scores of frames given as (objects on a line, tracks on a line)."""
    truth, tracks = [], []
    for number, (objects, found) in enumerate(frames, 1):
        truth += [(number, k, x, 0.0) for k, x in enumerate(objects)]
        tracks += [(number, k, x, 0.0) for k, x in enumerate(found)]
    scope = Scope(distance_threshold=threshold)
    return evaluate(make_tracks(tracks, Kind.POINT), make_truth(truth, Kind.POINT), scope)


def test_by_hand():
    # CHECKS: {0, 10} and {1, 30}, c = 4, p = 2, α = 2: GOSPA √17, OSPA √8.5.
    found = points([([0.0, 10.0], [1.0, 30.0])], 4.0).set_distances.scores()
    assert found["gospa"] == pytest.approx(sqrt(17.0))
    assert (found["gospa_localisation"], found["gospa_missed"], found["gospa_false"]) == (1, 8, 8)
    assert found["ospa"] == pytest.approx(sqrt(8.5))
    assert (found["ospa_localisation"], found["ospa_cardinality"]) == (8.5, 0.0)


def test_missing_rows_are_a_matter_of_number():
    found = points([([0.0, 10.0], [1.0])], 4.0).set_distances.scores()
    assert found["gospa"] == pytest.approx(sqrt(1 + 8))
    assert (found["ospa_localisation"], found["ospa_cardinality"]) == (0.5, 8.0)


@pytest.mark.parametrize("seed", range(20))
def test_against_the_definitions(seed):
    rng = np.random.default_rng(seed)
    frames = [
        tuple(rng.uniform(0, 10, rng.integers(0, 4)).tolist() for _ in range(2)) for _ in range(4)
    ]
    frames = [frame for frame in frames if frame[0] or frame[1]]
    found = points(frames, 3.0).set_distances.scores()
    for name, measure in (("gospa", reference.gospa), ("ospa", reference.ospa)):
        squares = [measure(*frame, lambda a, b: abs(a - b), 3.0) ** 2 for frame in frames]
        if frames:
            assert found[name] == pytest.approx(sqrt(np.mean(squares)))
    if frames:
        parts = found["gospa_localisation"] + found["gospa_missed"] + found["gospa_false"]
        assert found["gospa"] ** 2 == pytest.approx(parts)
        parts = found["ospa_localisation"] + found["ospa_cardinality"]
        assert found["ospa"] ** 2 == pytest.approx(parts)


def test_boxes_by_what_the_overlap_lacks():
    # IoU 8/12, cut-off 0.5.
    scores = evaluate(make_tracks(standing([1], 1, left=2.0)), make_truth(standing([1], 7)))
    assert scores.set_distances.scores()["gospa"] == pytest.approx(1 / 3)


def test_overall_is_over_all_frames():
    good = make_tracks(standing([1, 2, 3], 1)), make_truth(standing([1, 2, 3], 7))
    bad = make_tracks([]), make_truth(standing([1], 7))
    found = evaluate_all({"good": good, "bad": bad}).overall.set_distances.scores()
    assert found["gospa_missed"] == pytest.approx(0.5**2 / 2 / 4)
    assert found["ospa"] == pytest.approx(sqrt(0.5**2 / 4))


def test_nothing_to_measure():
    perfect = make_tracks(standing([1], 1)), make_truth(standing([1], 7))
    for scores in (
        evaluate(make_tracks([]), make_truth([])),
        evaluate(*perfect, Scope(iou_threshold=1.0)),
    ):
        assert set(scores.set_distances.scores().values()) == {None}
