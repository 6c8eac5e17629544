"""What must hold for any tracks and truth, with ties as common as they can be."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from tests.evaluation.made import Row, make_tracks, make_truth
from tracker.evaluation import Counts, Scope, evaluate, evaluate_all, is_perfect, self_check
from tracker.evaluation.scores import RATIOS
from tracker.log import Kind, Truth
from tracker.results import Tracks

Sequence = tuple[Tracks, Truth, Scope]
COLUMNS = ("frame", "time", "track", "z", "score", "label", "state", "reported", "line")


@st.composite
def rows(draw: st.DrawFn, kind: Kind, identities: int) -> list[Row]:
    """Up to `identities` rows in each of six frames, each identity once, on a coarse grid."""
    out: list[Row] = []
    for frame in range(6):
        for identity in sorted(draw(st.sets(st.integers(0, identities - 1)))):
            place = tuple(2.0 * draw(st.integers(0, 4)) for _ in range(2))
            out.append((frame, identity, *place, *((8.0, 8.0) if kind is Kind.BOX else ())))
    return out


@st.composite
def sequences(draw: st.DrawFn, kind: Kind | None = None) -> Sequence:
    kind = kind or draw(st.sampled_from(Kind))
    scope = Scope(
        iou_threshold=draw(st.sampled_from((0.2, 1 / 3, 0.5, 0.6))),
        distance_threshold=draw(st.sampled_from((2.0, 2.9, 4.0))),
    )
    tracks = make_tracks(draw(rows(kind, 6)), kind)
    return tracks, make_truth(draw(rows(kind, 4)), kind), scope


def counts(tracks: Tracks, truth: Truth, scope: Scope) -> Counts:
    return evaluate(tracks, truth, scope, with_referee=False).counts


@given(sequences())
def test_the_referee_agrees_and_sums_add_up(sequence):
    scores = evaluate(*sequence)  # raises InternalError where motmetrics counts otherwise
    c = scores.counts
    assert c.matches + c.misses == c.truth_boxes
    assert c.matches + c.false_positives == c.track_boxes
    assert c.identity_matches + c.identity_misses == c.truth_boxes
    assert c.identity_matches + c.identity_false_positives == c.track_boxes
    assert c.mostly_tracked + c.partially_tracked + c.mostly_lost == c.objects
    assert c.switches <= max(0, c.matches - 1)
    for name in RATIOS:
        value = getattr(scores, name)
        if value is not None:
            assert value <= 1.0 or name == "motp"
            assert value >= 0.0 or name == "mota"


@given(sequences(), st.randoms(use_true_random=False))
def test_order_of_rows_and_names_that_keep_their_order_change_nothing(sequence, random):
    tracks, truth, scope = sequence
    order = list(range(len(tracks)))
    random.shuffle(order)
    moved: dict[str, Any] = {name: getattr(tracks, name)[order] for name in COLUMNS}
    moved["track"] = 7 * moved["track"] + 2**60
    assert counts(replace(tracks, **moved), truth, scope) == counts(tracks, truth, scope)


@given(sequences(), st.integers(-1000, 1000), st.integers(1, 5))
def test_only_the_order_of_frames_matters(sequence, shift, step):
    tracks, truth, scope = sequence
    later = (replace(part, frame=part.frame * step + shift) for part in (tracks, truth))
    assert counts(*later, scope) == counts(tracks, truth, scope)


@given(sequences(), st.integers(0, 2**32 - 1))
def test_a_track_far_from_everything_is_one_false_positive(sequence, seed):
    # Off the grid: where pairs are equally close, one row more may decide for another of them.
    tracks, truth, scope = sequence
    rng = np.random.default_rng(seed)
    tracks = replace(tracks, z=tracks.z + rng.normal(0, 0.1, tracks.z.shape))
    truth = replace(truth, z=truth.z + rng.normal(0, 0.1, truth.z.shape))
    stray = (3, 99, 500.0, 500.0, *((8.0, 8.0) if tracks.kind is Kind.BOX else ()))
    one = make_tracks([stray], tracks.kind)
    more = replace(
        tracks, **{n: np.concatenate((getattr(tracks, n), getattr(one, n))) for n in COLUMNS}
    )
    before, after = counts(tracks, truth, scope), counts(more, truth, scope)
    assert after.frames - before.frames in (0, 1)
    wanted = replace(
        before,
        frames=after.frames,
        track_boxes=before.track_boxes + 1,
        false_positives=before.false_positives + 1,
        identity_false_positives=before.identity_false_positives + 1,
    )
    assert after == wanted


@given(rows(Kind.BOX, 4))
def test_truth_against_itself_is_perfect_where_objects_stand_apart(found):
    apart = [(f, k, left + 100.0 * k, *rest) for f, k, left, *rest in found]
    assert is_perfect(self_check(make_truth(apart)))


@given(st.lists(sequences(Kind.POINT), min_size=1, max_size=3))
def test_overall_is_the_sum_of_the_sequences(several):
    scope = several[0][2]
    found = evaluate_all(
        {str(k): (tracks, truth) for k, (tracks, truth, _) in enumerate(several)},
        scope,
        with_referee=False,
    )
    total = found.overall.counts
    for name in Counts.__dataclass_fields__:
        parts = [getattr(scores.counts, name) for scores in found.sequences.values()]
        assert getattr(total, name) == pytest.approx(sum(parts))
