"""What is scored: which rows of truth and tracks enter the comparison."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tracker.errors import UsageError
from tracker.evaluation.clearmot import pair_frames
from tracker.evaluation.frames import SideBySide, side_by_side
from tracker.evaluation.hota import THRESHOLDS
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


def scored_rows(tracks: Tracks, truth: Truth, scope: Scope) -> SideBySide:
    """Truth and tracks side by side, with only the rows that count.

    Raises UsageError if tracks and truth do not measure the same kind of thing, or as
    `Scope.for_truth`; InputError where an identity is twice in a frame.
    """
    if tracks.kind is not truth.kind:
        words = {Kind.BOX: "boxes", Kind.POINT: "points"}
        raise UsageError(f"the tracks are {words[tracks.kind]}, the truth {words[truth.kind]}")
    scope = scope.for_truth(truth)
    ignored = _labelled(truth, scope.classes_ignored)
    scored = truth.scored & _labelled(truth, scope.classes_scored) & ~ignored
    both = side_by_side(
        tracks,
        truth,
        _reported(tracks, scope.count_coasting),
        least_iou=min(scope.iou_threshold, float(THRESHOLDS[0])),
        reach=scope.distance_threshold or math.inf,
    )
    keep_truth = scored[both.truth_row]
    keep_track = np.ones(len(both.track_row), np.bool_)
    if ignored.any():
        keep_track = ~_on(both, ignored[both.truth_row], truth.kind, scope)
    if keep_truth.all() and keep_track.all():
        return both
    return both.only_rows(keep_truth, keep_track)


def close_pairs(both: SideBySide, kind: Kind, scope: Scope) -> NDArray[np.bool_]:
    """(E,) which pairs CLEAR MOT and the identity metrics may use (HOTA has its own thresholds)."""
    if kind is Kind.POINT:
        return np.ones(len(both.scene.distance), np.bool_)
    return both.scene.similarity >= scope.iou_threshold


def _on(
    both: SideBySide, ignored: NDArray[np.bool_], kind: Kind, scope: Scope
) -> NDArray[np.bool_]:
    """(M,) tracks that lie on ignored truth, by one joint matching of all rows of a frame.

    All annotated rows compete, so a track on a scored object beside an ignored one stays.
    """
    scene = both.only_pairs(close_pairs(both, kind, scope))
    match = pair_frames(scene, both.objects, keep=False)
    hit = ignored & (match >= 0)
    out = np.zeros(len(both.track_row), np.bool_)
    out[scene.pair_row[match[hit]]] = True
    return out


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
