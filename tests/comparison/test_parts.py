"""Counts of stretches of time: they add up to the counts of the whole."""

from __future__ import annotations

import numpy as np
import pytest

from tests.evaluation.made import make_tracks, make_truth, random_scene, standing
from tests.log.files import SHIPPED
from tracker.comparison.parts import COUNTS, frame_parts, scores_of
from tracker.comparison.rows import truth_rows
from tracker.evaluation import Scope
from tracker.evaluation.evaluate import examine
from tracker.evaluation.referee import referee_counts
from tracker.evaluation.scores import LIMITED
from tracker.log import Kind, read_track_file, read_truth

FLOATS = ("distance_sum",)


def parts_of(tracks, truth, scope=None):
    found = examine(tracks, truth, scope)
    rows = truth_rows(found)
    return found, rows, frame_parts(found, rows)


def check_sums(tracks, truth, scope=None):
    """Frames add up to our scores and to motmetrics' counts."""
    found, _, parts = parts_of(tracks, truth, scope)
    whole = parts.sum(axis=0)
    referee = referee_counts(found.counted.scene)
    for k, name in enumerate(COUNTS):
        for counts in (found.scores.counts, referee):
            wanted = getattr(counts, name)
            if name in FLOATS:  # sums of the same numbers in another order
                assert whole[k] == pytest.approx(wanted, rel=1e-12)
            else:
                assert whole[k] == wanted, name
    again = scores_of(whole, found.scores.kinds)
    for name in LIMITED:
        wanted = found.scores.value(name)
        assert again.value(name) == (None if wanted is None else pytest.approx(wanted, rel=1e-12))


@pytest.mark.parametrize("ties", [False, True])
@pytest.mark.parametrize("kind", list(Kind))
@pytest.mark.parametrize("seed", range(4))
def test_frames_add_up_to_the_whole(seed, kind, ties):
    tracks, truth = random_scene(seed, kind=kind, ties=ties)
    check_sums(tracks, truth, Scope(distance_threshold=6.0))


# Real detections and tracks; their counts are motmetrics' own (tests/evaluation/test_published.py).
@pytest.mark.parametrize("name", ["TUD-Campus", "TUD-Stadtmitte"])
def test_frames_of_the_shipped_sequences_add_up(name):
    check_sums(read_track_file(SHIPPED / name / "test.txt"), read_truth(SHIPPED / name / "gt.txt"))


def test_frames_with_nothing_to_pair_add_up():
    nothing, some = [], standing([1, 2], 1)
    check_sums(make_tracks(nothing), make_truth(some))
    check_sums(make_tracks(some), make_truth(nothing))
    check_sums(make_tracks(nothing), make_truth(nothing))


def test_by_hand():
    """One object in frames 1 to 6; track 1 on it in 1 and 2, track 2 in 4, 5 and 6, and track 3
    far away in 3.

    Its own track is 2 (three frames against two). A(c) is 2/6 with track 1 (2 of 6 + 2 − 2 rows),
    3/6 with track 2.
    """
    truth = make_truth(standing(range(1, 7), 7))
    tracks = make_tracks(
        sorted(standing([1, 2], 1) + standing([4, 5, 6], 2) + standing([3], 3, left=500.0))
    )
    _, rows, parts = parts_of(tracks, truth)
    column = dict(zip(COUNTS, parts.T, strict=False))
    assert column["matches"].tolist() == [1, 1, 0, 1, 1, 1]
    assert column["misses"].tolist() == [0, 0, 1, 0, 0, 0]
    assert column["false_positives"].tolist() == [0, 0, 1, 0, 0, 0]
    assert column["switches"].tolist() == [0, 0, 0, 1, 0, 0]
    assert column["fragmentations"].tolist() == [0, 0, 0, 1, 0, 0]
    assert column["identity_matches"].tolist() == [0, 0, 0, 1, 1, 1]
    assert column["identity_misses"].tolist() == [1, 1, 1, 0, 0, 0]
    assert column["identity_false_positives"].tolist() == [1, 1, 1, 0, 0, 0]
    assert column["objects"].tolist() == [1, 0, 0, 0, 0, 0]
    assert column["mostly_tracked"].tolist() == [1, 0, 0, 0, 0, 0]  # five of six frames
    association = parts[:, len(COUNTS) + 19 : len(COUNTS) + 38]
    wanted = np.array([2 / 6, 2 / 6, 0, 3 / 6, 3 / 6, 3 / 6])
    np.testing.assert_allclose(association, np.repeat(wanted[:, None], 19, axis=1), rtol=1e-12)
    # GOSPA, c = 0.5: c²/2 for the missed object and as much for the false track, in frame 3.
    assert parts[:, -7:].sum(axis=0)[:4].tolist() == [6, 0, 0.125, 0.125]
    assert rows.own.tolist() == [False] * 3 + [True] * 3


def test_an_object_that_is_not_annotated_for_a_while_has_no_fragment():
    truth = make_truth(standing([1, 2, 5, 6], 7))
    _, rows, _ = parts_of(make_tracks(standing([1, 2, 5, 6], 1)), truth)
    assert not rows.resumed.any()
