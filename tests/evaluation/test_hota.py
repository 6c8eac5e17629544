"""HOTA by hand from its formulas (Luiten et al. 2021; formulas from memory)."""

from __future__ import annotations

from collections import Counter
from math import sqrt

import numpy as np
import pytest
from scipy.optimize import linear_sum_assignment

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


def by_the_formulas(track_file, truth_file, alpha):
    """HOTA, DetA, AssA, LocA of benchmark text files by numpy and scipy, dense and slow."""
    rows = [np.loadtxt(path, delimiter=",")[:, :6] for path in (truth_file, track_file)]
    pairs = []  # frame, object, track, similarity
    for frame in np.unique(rows[0][:, 0]):
        for a in rows[0][rows[0][:, 0] == frame]:
            for b in rows[1][rows[1][:, 0] == frame]:
                low, high = np.maximum(a[2:4], b[2:4]), np.minimum(a[2:4] + a[4:], b[2:4] + b[4:])
                shared = np.prod(np.clip(high - low, 0, None))
                iou = shared / (a[4] * a[5] + b[4] * b[5] - shared)
                if iou >= alpha:
                    pairs.append((frame, a[1], b[1], iou))
    size = [Counter(table[:, 1]) for table in rows]

    def accuracy(count, couple):
        return count[couple] / (size[0][couple[0]] + size[1][couple[1]] - count[couple])

    possible = Counter((a, b) for _, a, b, _ in pairs)
    hits = []
    for frame in {pair[0] for pair in pairs}:
        here = [pair for pair in pairs if pair[0] == frame]
        objects, tracks = (sorted({pair[k] for pair in here}) for k in (1, 2))
        weight = np.zeros((len(objects), len(tracks)))
        for _, a, b, iou in here:
            weight[objects.index(a), tracks.index(b)] = (
                1e5 + accuracy(possible, (a, b)) + 1e-5 * iou
            )
        for i, j in zip(*linear_sum_assignment(weight, maximize=True), strict=True):
            hits += [pair for pair in here if pair[1:3] == (objects[i], tracks[j])]
    found = Counter((a, b) for _, a, b, _ in hits)
    association = sum(accuracy(found, (a, b)) for _, a, b, _ in hits)
    union = len(rows[0]) + len(rows[1]) - len(hits)
    loca = sum(pair[3] for pair in hits) / len(hits)
    return sqrt(association / union), len(hits) / union, association / len(hits), loca


@pytest.mark.parametrize("alpha", [0.05, 0.25, 0.3, 0.5, 0.75])
def test_a_real_sequence_against_the_formulas(alpha):
    files = SHIPPED / "TUD-Campus" / "test.txt", SHIPPED / "TUD-Campus" / "gt.txt"
    scores = evaluate(read_track_file(files[0]), read_truth(files[1]))
    assert hota(scores, f"{alpha:.2f}") == pytest.approx(by_the_formulas(*files, alpha), abs=1e-9)
