"""HOTA by hand from its formulas (Luiten et al. 2021; formulas from memory)."""

from __future__ import annotations

from math import sqrt

import pytest

from tests.evaluation.made import make_tracks, make_truth, random_scene, standing
from tests.log.files import SHIPPED
from tracker.evaluation import Scope, evaluate, evaluate_all
from tracker.log import Kind, read_track_file, read_truth

TEN = range(1, 11)


def hota(scores, threshold="0.50"):
    found = scores.hota_counts.by_threshold()[threshold]
    return tuple(found[name] for name in ("hota", "deta", "assa", "loca"))


def test_identity_changes_once():
    # CHECKS by hand: DetA 1; each half shares 5 of 10 rows with the object: A(c) = 5 / 10.
    tracks = make_tracks(standing(range(1, 6), 1) + standing(range(6, 11), 2))
    scores = evaluate(tracks, make_truth(standing(TEN, 7)))
    assert hota(scores) == pytest.approx((0.7071067811865476, 1.0, 0.5, 1.0))
    assert scores.hota == pytest.approx(sqrt(0.5))
    assert (scores.deta, scores.assa, scores.loca) == (1.0, 0.5, 1.0)


def test_half_of_an_object_is_found():
    # TP 5, FN 5: DetA 0.5, A(c) = 5 / (5 + 5) = 0.5.
    scores = evaluate(make_tracks(standing(range(1, 6), 1)), make_truth(standing(TEN, 7)))
    assert hota(scores) == pytest.approx((0.5, 0.5, 0.5, 1.0))


def test_thresholds_follow_the_overlap():
    # Boxes shifted by 2 of 10 have IoU 8 / 12: true positives up to 0.65, none from 0.70 on.
    scores = evaluate(make_tracks(standing(TEN, 1, left=2.0)), make_truth(standing(TEN, 7)))
    assert hota(scores, "0.65") == pytest.approx((1.0, 1.0, 1.0, 2 / 3))
    assert hota(scores, "0.70") == (0.0, 0.0, 0.0, None)
    assert scores.hota == pytest.approx(13 / 19)
    assert scores.loca == pytest.approx(2 / 3)


def test_association_decides_between_tracks_that_cover_an_object_equally_often():
    # Track 1 has the object for eight frames, track 2 lies closer in one of them: the longer
    # association is worth more than the closer box.
    rows = standing(range(1, 9), 1, left=2.0) + standing([4], 2)
    scores = evaluate(make_tracks(rows), make_truth(standing(range(1, 9), 7)))
    assert hota(scores)[2] == pytest.approx(1.0)
    assert hota(scores)[1] == pytest.approx(8 / 9)


def test_points_by_their_share_of_the_threshold():
    # At 3 of 10: similarity 0.7.
    truth = make_truth([(f, 1, 0.0, 0.0) for f in TEN], Kind.POINT)
    tracks = make_tracks([(f, 1, 0.0, 3.0) for f in TEN], Kind.POINT)
    scores = evaluate(tracks, truth, Scope(distance_threshold=10.0))
    assert hota(scores, "0.65") == pytest.approx((1.0, 1.0, 1.0, 0.7))
    assert hota(scores, "0.75")[0] == 0.0


def test_truth_against_itself():
    path = SHIPPED / "TUD-Campus" / "gt.txt"
    scores = evaluate(read_track_file(path), read_truth(path))
    assert (scores.hota, scores.deta, scores.assa) == (1.0, 1.0, 1.0)
    assert scores.loca == pytest.approx(1.0)


def test_nothing_to_measure():
    tracks, truth = make_tracks(standing(TEN, 1)), make_truth(standing(TEN, 7))
    nothing = evaluate(make_tracks([]), make_truth([]))
    assert (nothing.hota, nothing.deta, nothing.assa, nothing.loca) == (None,) * 4
    for one_sided in (evaluate(make_tracks([]), truth), evaluate(tracks, make_truth([]))):
        assert (one_sided.hota, one_sided.deta, one_sided.assa) == (0.0, 0.0, 0.0)
        assert one_sided.loca is None


def test_overall_comes_from_summed_counts():
    half = (make_tracks(standing(range(1, 6), 1)), make_truth(standing(TEN, 7)))
    whole = (make_tracks(standing(TEN, 1)), make_truth(standing(TEN, 7)))
    overall = evaluate_all({"half": half, "whole": whole}).overall
    # TP 15, FN 5; sum of A(c) = 5 × 0.5 + 10 × 1.
    assert hota(overall) == pytest.approx((sqrt(12.5 / 20), 15 / 20, 12.5 / 15, 1.0))


@pytest.mark.parametrize("seed", range(4))
def test_hota_is_the_geometric_mean_at_each_threshold(seed):
    tracks, truth = random_scene(seed)
    for row in evaluate(tracks, truth).hota_counts.by_threshold().values():
        assert row["hota"] == pytest.approx(sqrt(row["deta"] * row["assa"]))
        assert row["loca"] is None or 0 < row["loca"] <= 1
