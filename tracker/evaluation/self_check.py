"""Truth scored against itself: anything but 100% tells of the truth or the options."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from tracker.evaluation.evaluate import evaluate
from tracker.evaluation.scope import Scope, labelled
from tracker.evaluation.scores import Scores
from tracker.log.model import Truth
from tracker.results.tracks import Tracks, TrackState


def self_check(truth: Truth, scope: Scope | None = None, *, with_referee: bool = True) -> Scores:
    """Scores of the truth as if it were the result. Raises what `evaluate` raises."""
    scope = scope or Scope()
    # Rows of other classes would rightly be false positives.
    wanted = truth.scored & labelled(truth, scope.for_truth(truth).classes_scored)
    wanted |= labelled(truth, scope.for_truth(truth).classes_ignored)
    return evaluate(truth_as_tracks(truth, wanted), truth, scope, with_referee=with_referee)


def is_perfect(scores: Scores) -> bool:
    """Whether every object kept its own track; true without anything to score."""
    c = scores.counts
    return c.identity_matches == c.truth_boxes == c.track_boxes == c.matches and not c.switches


def truth_as_tracks(truth: Truth, keep: NDArray[np.bool_]) -> Tracks:
    """The kept (n,) rows of the truth as tracks."""
    count = int(keep.sum())
    frame = truth.frame[keep]
    return Tracks(
        name=truth.name,
        kind=truth.kind,
        facts=truth.facts,
        frame=frame,
        time=frame.astype(np.float64) if truth.time is None else truth.time[keep],
        track=truth.object[keep],
        z=truth.z[keep],
        score=np.full(count, np.nan),
        label=truth.label[keep],
        labels=truth.labels,
        state=np.full(count, TrackState.CONFIRMED, np.int8),
        reported=np.ones(count, np.bool_),
        line=truth.line[keep],
    )
