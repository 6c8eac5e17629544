"""Small cases whose scores follow from the definitions by hand."""

from __future__ import annotations

import pytest

from tests.evaluation.made import make_tracks, make_truth, random_scene, standing
from tests.log.files import SHIPPED
from tracker.errors import InputError, UsageError
from tracker.evaluation import Scope, evaluate, evaluate_all
from tracker.log import Kind, read_track_file, read_truth

TEN = range(1, 11)


def counts(scores):
    c = scores.counts
    return c.matches, c.false_positives, c.misses, c.switches, c.fragmentations


def test_identity_changes_once():
    # By the definitions: one switch in ten rows, and half of the rows under the better identity.
    tracks = make_tracks(standing(range(1, 6), 1) + standing(range(6, 11), 2))
    scores = evaluate(tracks, make_truth(standing(TEN, 7)))
    assert scores.mota == pytest.approx(0.9)
    assert scores.idf1 == pytest.approx(0.5)
    assert counts(scores) == (10, 0, 0, 1, 0)
    assert scores.motp == 0.0


@pytest.mark.parametrize("name", ["TUD-Campus", "TUD-Stadtmitte"])
def test_truth_against_itself_is_perfect(name):
    path = SHIPPED / name / "gt.txt"
    scores = evaluate(read_track_file(path), read_truth(path))
    ratios = (scores.mota, scores.idf1, scores.idp, scores.idr, scores.precision, scores.recall)
    assert ratios == (1.0,) * 6
    assert scores.motp == pytest.approx(0.0, abs=1e-12)
    assert scores.counts.mostly_tracked == scores.counts.objects


def test_gap_is_a_fragmentation_not_a_switch():
    tracks = make_tracks(standing([1, 2, 3, 7, 8, 9, 10], 1))
    scores = evaluate(tracks, make_truth(standing(TEN, 7)))
    assert counts(scores) == (7, 0, 3, 0, 1)
    assert scores.counts.partially_tracked == 1


def test_object_that_leaves_and_returns_under_another_identity_is_a_switch():
    truth = make_truth(standing([1, 2, 8, 9], 7))
    scores = evaluate(make_tracks(standing([1, 2], 1) + standing([8, 9], 2)), truth)
    assert counts(scores) == (4, 0, 0, 1, 0)  # unannotated frames are no fragmentation


def test_earlier_pairing_is_kept_though_another_is_closer():
    # CLEAR MOT keeps a pairing as long as it is possible (Bernardin and Stiefelhagen 2008, §2.1).
    rows = standing([1], 1) + standing([2], 1, left=3.0) + standing([2], 2)
    scores = evaluate(make_tracks(rows), make_truth(standing([1, 2], 7)))
    assert counts(scores) == (2, 1, 0, 0, 0)


def test_no_tracks():
    scores = evaluate(make_tracks([]), make_truth(standing(TEN, 7)))
    assert counts(scores) == (0, 0, 10, 0, 0)
    assert (scores.mota, scores.idf1, scores.recall) == (0.0, 0.0, 0.0)
    assert (scores.precision, scores.idp, scores.motp) == (None, None, None)
    assert scores.counts.mostly_lost == 1
    assert scores.counts.identity_misses == 10


def test_no_truth():
    scores = evaluate(make_tracks(standing(TEN, 1)), make_truth([]))
    assert counts(scores) == (0, 10, 0, 0, 0)
    assert (scores.mota, scores.recall, scores.idr) == (None, None, None)
    assert (scores.precision, scores.idf1) == (0.0, 0.0)
    assert scores.counts.identity_false_positives == 10


def test_nothing_at_all():
    scores = evaluate(make_tracks([]), make_truth([]))
    found = scores.as_dict()
    found |= found.pop("hota_by_threshold")["0.50"] | found.pop("durations")["gap_frames"]
    assert set(found.values()) <= {0, None}


def test_nothing_ever_close():
    tracks = make_tracks(standing(TEN, 1, left=500.0))
    scores = evaluate(tracks, make_truth(standing(TEN, 7)))
    assert counts(scores) == (0, 10, 10, 0, 0)
    assert (scores.mota, scores.idf1, scores.motp) == (-1.0, 0.0, None)


def test_frames_beyond_the_truth_are_false_positives():
    scores = evaluate(make_tracks(standing(TEN, 1)), make_truth(standing(range(3, 7), 7)))
    assert counts(scores) == (4, 6, 0, 0, 0)
    assert scores.counts.frames == 10


def test_large_and_text_like_identities_stay_apart():
    # motmetrics passes identities through float: 2**53 and 2**53 + 1 would be one.
    rows = standing([1, 2], 2**53) + standing([1, 2], 2**53 + 1, left=50.0)
    tracks = make_tracks([(*row[:1], 0, *row[2:]) for row in rows])
    tracks.track[:] = [2**53, 2**53, 2**53 + 1, 2**53 + 1]
    truth = make_truth(standing([1, 2], 1) + standing([1, 2], 2, left=50.0))
    assert counts(evaluate(tracks, truth)) == (4, 0, 0, 0, 0)


def test_order_of_rows_does_not_matter():
    tracks, truth = random_scene(3)
    mixed = make_tracks(
        [(f, k, *z) for f, k, z in zip(tracks.frame, tracks.track, tracks.z, strict=True)][::-1],
        z=tracks.z[::-1],
    )
    assert evaluate(mixed, truth).as_dict() == evaluate(tracks, truth).as_dict()


def test_a_track_twice_in_a_frame_is_refused():
    with pytest.raises(InputError, match="track 1 is twice in frame 2"):
        evaluate(make_tracks(standing([1, 2, 2], 1)), make_truth(standing([1, 2], 7)))


def test_an_object_twice_in_a_frame_is_refused():
    with pytest.raises(InputError, match="object '7' is twice in frame 2"):
        evaluate(make_tracks(standing([1, 2], 1)), make_truth(standing([1, 2, 2], 7)))


class TestPoints:
    truth = make_truth([(1, 1, 0.0, 0.0), (2, 1, 0.0, 0.0)], Kind.POINT)

    def test_distance_is_euclidean_and_the_threshold_included(self):
        tracks = make_tracks([(1, 1, 3.0, 4.0), (2, 1, 3.0, 4.1)], Kind.POINT)
        scores = evaluate(tracks, self.truth, Scope(distance_threshold=5.0))
        assert counts(scores) == (1, 1, 1, 0, 0)
        assert scores.motp == 5.0

    def test_a_threshold_is_needed(self):
        with pytest.raises(UsageError, match="--distance-threshold"):
            evaluate(make_tracks([(1, 1, 0.0, 0.0)], Kind.POINT), self.truth)

    def test_boxes_are_not_points(self):
        with pytest.raises(UsageError, match="the tracks are boxes, the truth points"):
            evaluate(make_tracks(standing([1], 1)), self.truth, Scope(distance_threshold=1.0))


@pytest.mark.parametrize("threshold", [0.0, -0.1, 1.5, float("nan")])
def test_iou_threshold_range(threshold):
    with pytest.raises(UsageError, match="IoU threshold"):
        evaluate(make_tracks([]), make_truth([]), Scope(iou_threshold=threshold))


def test_iou_threshold_is_included():
    # Shifted by 2 of 10: 8 shared of 12, IoU 2/3.
    tracks = make_tracks(standing([1], 1, left=2.0))
    truth = make_truth(standing([1], 7))
    assert counts(evaluate(tracks, truth, Scope(iou_threshold=8 / 12)))[0] == 1
    assert counts(evaluate(tracks, truth, Scope(iou_threshold=0.67)))[0] == 0
    assert evaluate(tracks, truth).motp == pytest.approx(1 / 3)


def test_overall_comes_from_sums():
    # 1 of 1 rows and 0 of 9: recall 0.1, where an average of ratios would say 0.5.
    short = (make_tracks(standing([1], 1)), make_truth(standing([1], 7)))
    long = (make_tracks([]), make_truth(standing(range(1, 10), 7)))
    found = evaluate_all({"short": short, "long": long})
    assert found.overall.recall == pytest.approx(0.1)
    assert found.overall.mota == pytest.approx(0.1)
    assert found.overall.idf1 == pytest.approx(2 / 11)
    assert found.overall.counts.truth_boxes == 10
    assert set(found.as_dict()) == {"overall", "sequences"}
    assert list(found.as_dict()["sequences"]) == ["short", "long"]
