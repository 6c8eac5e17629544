"""What is scored: which rows of truth and tracks enter the comparison."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import linear_sum_assignment

from tracker.errors import UsageError
from tracker.evaluation.distance import distances
from tracker.evaluation.frames import FramePair, frame_pairs
from tracker.log.model import Kind, Truth
from tracker.results.tracks import Tracks, TrackState

# The public benchmark's pedestrian class, and what looks like one: neither found nor wrong.
BENCHMARK_SCORED = ("1",)
BENCHMARK_IGNORED = ("2", "7", "8", "12")


@dataclass(frozen=True, slots=True)
class Scope:
    """What enters the comparison.

    iou_threshold : least IoU of a paired box.   distance_threshold : largest distance of a
    paired point, in its own unit.   classes_scored : labels of the truth that are scored, None
    for all.   classes_ignored : a track box that pairs with such a row is taken out.
    count_coasting : whether coasting rows count; None follows the file's `reported`.
    """

    iou_threshold: float = 0.5
    distance_threshold: float | None = None
    classes_scored: tuple[str, ...] | None = None
    classes_ignored: tuple[str, ...] = ()
    count_coasting: bool | None = None

    def for_truth(self, truth: Truth) -> Scope:
        """The scope with the documented defaults for this truth file filled in.

        A file in the public benchmark layout that has classes is scored on class 1, and classes
        2, 7, 8 and 12 are ignored, unless classes were chosen.

        Raises UsageError where a threshold is missing or out of range.
        """
        if not 0.0 < self.iou_threshold <= 1.0:
            raise UsageError(
                f"the IoU threshold is above 0 and at most 1, not {self.iou_threshold}"
            )
        if truth.kind is Kind.POINT and not (self.distance_threshold or 0.0) > 0.0:
            raise UsageError(
                "points are paired by distance: give the largest distance at which a track still "
                "counts as on its object (--distance-threshold, in the log's unit)"
            )
        if self.classes_scored is not None or self.classes_ignored:
            return self
        if truth.format != "benchmark" or not truth.labels:
            return self
        return Scope(
            self.iou_threshold,
            self.distance_threshold,
            BENCHMARK_SCORED,
            BENCHMARK_IGNORED,
            self.count_coasting,
        )


def scored_pairs(tracks: Tracks, truth: Truth, scope: Scope) -> list[FramePair]:
    """The frames to compare, with only the rows that count.

    Raises UsageError if tracks and truth do not measure the same kind of thing, or as
    `Scope.for_truth`.
    """
    if tracks.kind is not truth.kind:
        words = {Kind.BOX: "boxes", Kind.POINT: "points"}
        raise UsageError(f"the tracks are {words[tracks.kind]}, the truth {words[truth.kind]}")
    scope = scope.for_truth(truth)
    ignored = _labelled(truth, scope.classes_ignored)
    scored = truth.scored & _labelled(truth, scope.classes_scored) & ~ignored
    pairs = frame_pairs(tracks, truth, _reported(tracks, scope.count_coasting))
    return [_in_scope(pair, scored, ignored, truth.kind, scope) for pair in pairs]


def _reported(tracks: Tracks, count_coasting: bool | None) -> NDArray[np.bool_]:
    if count_coasting is None:
        return tracks.reported
    coasting = tracks.state == TrackState.COASTING
    return (tracks.reported & ~coasting) | (coasting if count_coasting else False)


def _labelled(truth: Truth, wanted: tuple[str, ...] | None) -> NDArray[np.bool_]:
    if wanted is None:
        return np.ones(len(truth), np.bool_)
    codes = [code for code, name in enumerate(truth.labels) if name in wanted]
    return np.isin(truth.label, codes)


def _in_scope(
    pair: FramePair,
    scored: NDArray[np.bool_],
    ignored: NDArray[np.bool_],
    kind: Kind,
    scope: Scope,
) -> FramePair:
    """Take out what does not count; tracks on ignored truth by one joint matching of all rows."""
    wanted = scored[pair.truth_row]
    on_ignored = ignored[pair.truth_row]
    if on_ignored.any() and len(pair.track):
        # All annotated rows compete, so a track on a scored object beside an ignored one stays.
        apart = distances(pair, kind, scope.iou_threshold, scope.distance_threshold)
        allowed = np.isfinite(apart)
        far = 2.0 * min(apart.shape) * (1.0 + np.max(apart, where=allowed, initial=0.0))
        rows, columns = linear_sum_assignment(np.where(allowed, apart, far))
        taken = allowed[rows, columns] & on_ignored[rows]
        keep = np.ones(len(pair.track), np.bool_)
        keep[columns[taken]] = False
        pair = pair.only_tracks(keep)
    return pair if wanted.all() else pair.only_truth(wanted)
