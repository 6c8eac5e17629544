"""What is scored: classes, flags, coasting rows, the public benchmark's defaults."""

from __future__ import annotations

import numpy as np
import pytest

from tests.evaluation.made import make_tracks, make_truth, standing
from tracker.evaluation import Scope, evaluate
from tracker.log import Kind, read_truth
from tracker.results import TrackState

PEOPLE = standing([1, 2], 1)
CARTS = standing([1, 2], 2, left=100.0)
WORDS = ["person", "person", "cart", "cart"]
ON_BOTH = standing([1, 2], 1) + standing([1, 2], 2, left=100.0)


def totals(scores):
    c = scores.counts
    return c.matches, c.false_positives, c.misses


def test_all_classes_count_by_default():
    assert totals(evaluate(make_tracks(ON_BOTH), make_truth(PEOPLE + CARTS, words=WORDS))) == (
        4, 0, 0,
    )  # fmt: skip


def test_a_track_on_a_class_that_is_not_scored_is_wrong():
    truth = make_truth(PEOPLE + CARTS, words=WORDS)
    scope = Scope(classes_scored=("person",))
    assert totals(evaluate(make_tracks(ON_BOTH), truth, scope)) == (2, 2, 0)


def test_a_track_on_an_ignored_class_is_neither():
    truth = make_truth(PEOPLE + CARTS, words=WORDS)
    scope = Scope(classes_scored=("person",), classes_ignored=("cart",))
    scores = evaluate(make_tracks(ON_BOTH), truth, scope)
    assert totals(scores) == (2, 0, 0)
    assert scores.counts.track_boxes == 2


def test_an_ignored_class_alone_is_not_scored_either():
    truth = make_truth(PEOPLE + CARTS, words=WORDS)
    scope = Scope(classes_ignored=("cart",))
    assert totals(evaluate(make_tracks(ON_BOTH), truth, scope)) == (2, 0, 0)


def test_scored_and_ignored_objects_compete_for_a_track():
    # The cart overlaps the only track a little worse than the person does: the track stays.
    truth = make_truth([(1, 1, 0, 0, 10, 20), (1, 2, 2, 0, 10, 20)], words=["person", "cart"])
    scope = Scope(classes_scored=("person",), classes_ignored=("cart",))
    assert totals(evaluate(make_tracks([(1, 1, 0.5, 0, 10, 20)]), truth, scope)) == (1, 0, 0)
    assert totals(evaluate(make_tracks([(1, 1, 1.5, 0, 10, 20)]), truth, scope)) == (0, 0, 1)


def test_points_on_ignored_objects():
    truth = make_truth([(1, 1, 0.0, 0.0), (1, 2, 50.0, 0.0)], Kind.POINT, words=["boat", "buoy"])
    tracks = make_tracks([(1, 1, 1.0, 0.0), (1, 2, 51.0, 0.0)], Kind.POINT)
    scope = Scope(distance_threshold=5.0, classes_scored=("boat",), classes_ignored=("buoy",))
    assert totals(evaluate(tracks, truth, scope)) == (1, 0, 0)


def test_rows_flagged_as_not_scored_are_left_out():
    truth = make_truth(PEOPLE, scored=np.array([True, False]))
    scores = evaluate(make_tracks(standing([1, 2], 1)), truth)
    assert totals(scores) == (1, 1, 0)
    assert scores.counts.truth_boxes == 1


class TestCoasting:
    state = np.array([TrackState.CONFIRMED, TrackState.COASTING], np.int8)
    truth = make_truth(standing([1, 2], 7))

    def matches(self, reported, count_coasting):
        tracks = make_tracks(
            standing([1, 2], 1), state=self.state, reported=np.array([True, reported])
        )
        return evaluate(tracks, self.truth, Scope(count_coasting=count_coasting)).counts.matches

    @pytest.mark.parametrize(
        ("reported", "count_coasting", "matches"),
        [
            (True, None, 2), (False, None, 1), (True, True, 2), (False, True, 2),
            (True, False, 1), (False, False, 1),
        ],
    )  # fmt: skip
    def test_coasting(self, reported, count_coasting, matches):
        assert self.matches(reported, count_coasting) == matches

    def test_tentative_rows_never_become_output(self):
        tracks = make_tracks(
            standing([1, 2], 1),
            state=np.array([TrackState.TENTATIVE, TrackState.COASTING], np.int8),
            reported=np.array([False, False]),
        )
        scores = evaluate(tracks, self.truth, Scope(count_coasting=True))
        assert totals(scores) == (1, 0, 1)


class TestBenchmarkDefaults:
    """The public benchmark's practice: class 1 scored, 2, 7, 8 and 12 ignored (from memory)."""

    LINES = (
        "1,1,0,0,10,20,1,1,1.0",  # a person, scored
        "1,2,100,0,10,20,0,1,1.0",  # a person flagged 0
        "1,3,200,0,10,20,0,7,1.0",  # a standing person: ignored
        "1,4,300,0,10,20,0,3,1.0",  # a car: not scored, not ignored
    )
    TRACKS = tuple(
        (1, k + 1, left, 0.0, 10.0, 20.0) for k, left in enumerate((0.0, 100.0, 200.0, 300.0))
    )

    def truth(self, folder, lines=LINES):
        path = folder / "gt.txt"
        path.write_text("\n".join(lines) + "\n", encoding="utf-8")
        return read_truth(path)

    def test_defaults(self, tmp_path):
        assert totals(evaluate(make_tracks(self.TRACKS), self.truth(tmp_path))) == (1, 2, 0)

    def test_choosing_classes_replaces_them(self, tmp_path):
        scope = Scope(classes_ignored=("3",))
        assert totals(evaluate(make_tracks(self.TRACKS), self.truth(tmp_path), scope)) == (1, 2, 0)
        scope = Scope(classes_scored=("1",))
        assert totals(evaluate(make_tracks(self.TRACKS), self.truth(tmp_path), scope)) == (1, 3, 0)

    def test_other_formats_have_no_such_defaults(self):
        truth = make_truth(list(self.TRACKS), words=["1", "1", "7", "3"])
        assert totals(evaluate(make_tracks(self.TRACKS), truth)) == (4, 0, 0)
