"""What is scored: which rows of truth and tracks enter the comparison."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray
from shapely import intersects_xy
from shapely.geometry.base import BaseGeometry

from tracker.errors import UsageError
from tracker.evaluation.clearmot import pair_frames
from tracker.evaluation.frames import SideBySide, side_by_side
from tracker.evaluation.hota import THRESHOLDS
from tracker.log.model import Floats, Kind, Truth
from tracker.results.tracks import Tracks, TrackState

# The public benchmark's pedestrian class, and what looks like one: neither found nor wrong.
BENCHMARK_SCORED = ("1",)
BENCHMARK_IGNORED = ("2", "7", "8", "12")


@dataclass(frozen=True, slots=True)
class Scope:
    """What enters the comparison.

    iou_threshold : least IoU of a paired box.   distance_threshold : largest distance of a
    paired point, in its own unit.   classes_scored : labels of the truth that are scored, None
    for all.   classes_ignored : a track that pairs with such a row, at these thresholds, is taken
    out.
    count_coasting : whether coasting rows count; None follows the file's `reported`.
    visibility_floor : truth that is less visible is ignored as such classes are.
    regions_ignored : so is truth whose centre is in one of these areas, and there a track that
    pairs with nothing is taken out too.   frame_stride : score every k-th annotated frame and no
    other; None scores all frames, annotated or not.
    track_classes_left_out : tracks with these labels do not count (for scores per class).
    """

    iou_threshold: float = 0.5
    distance_threshold: float | None = None
    classes_scored: tuple[str, ...] | None = None
    classes_ignored: tuple[str, ...] = ()
    count_coasting: bool | None = None
    visibility_floor: float | None = None
    regions_ignored: tuple[BaseGeometry, ...] = ()
    frame_stride: int | None = None
    track_classes_left_out: tuple[str, ...] = ()

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
        if truth.kind is Kind.POINT and not 0.0 < (self.distance_threshold or 0.0) < math.inf:
            raise UsageError(
                "points are paired by distance: give the largest distance at which a track still "
                "counts as on its object (--distance-threshold, in the log's unit)"
            )
        if self.visibility_floor is not None and not 0.0 <= self.visibility_floor <= 1.0:
            raise UsageError(f"visibility is between 0 and 1, not {self.visibility_floor}")
        if self.frame_stride is not None and self.frame_stride < 1:
            raise UsageError(f"the frame stride is at least 1, not {self.frame_stride}")
        if self.classes_scored is not None or self.classes_ignored:
            return self
        if truth.format != "benchmark" or not truth.labels:
            return self
        return replace(self, classes_scored=BENCHMARK_SCORED, classes_ignored=BENCHMARK_IGNORED)


def scored_rows(tracks: Tracks, truth: Truth, scope: Scope) -> SideBySide:
    """Truth and tracks side by side, with only the rows that count.

    Raises UsageError if tracks and truth do not measure the same kind of thing, or as
    `Scope.for_truth`; InputError where an identity is twice in a frame.
    """
    if tracks.kind is not truth.kind:
        words = {Kind.BOX: "boxes", Kind.POINT: "points"}
        raise UsageError(f"the tracks are {words[tracks.kind]}, the truth {words[truth.kind]}")
    scope = scope.for_truth(truth)
    ignored = labelled(truth, scope.classes_ignored) | _in_regions(truth.z, scope)
    if scope.visibility_floor is not None:
        ignored |= truth.visibility < scope.visibility_floor
    scored = truth.scored & labelled(truth, scope.classes_scored) & ~ignored
    both = side_by_side(
        tracks,
        truth,
        counted_rows(tracks, scope),
        least_iou=min(scope.iou_threshold, float(THRESHOLDS[0])),
        reach=scope.distance_threshold or math.inf,
    )
    keep_truth = scored[both.truth_row]
    keep_track = np.ones(len(both.track_row), np.bool_)
    if ignored.any() or scope.regions_ignored:
        keep_track = ~_beside(both, ignored[both.truth_row], tracks, scope)
    if scope.frame_stride is not None:
        truth_rows, track_rows = np.diff(both.scene.truth_start), np.diff(both.scene.track_start)
        frame = np.zeros(len(both.numbers), np.bool_)
        frame[np.flatnonzero(truth_rows)[:: scope.frame_stride]] = True
        keep_truth = keep_truth & np.repeat(frame, truth_rows)
        keep_track = keep_track & np.repeat(frame, track_rows)
    if keep_truth.all() and keep_track.all():
        return both
    return both.only_rows(keep_truth, keep_track)


def close_pairs(both: SideBySide, kind: Kind, scope: Scope) -> NDArray[np.bool_]:
    """(E,) which pairs CLEAR MOT and the identity metrics may use (HOTA has its own thresholds)."""
    if kind is Kind.POINT:
        return np.ones(len(both.scene.distance), np.bool_)
    return both.scene.similarity >= scope.iou_threshold


def _beside(
    both: SideBySide, ignored: NDArray[np.bool_], tracks: Tracks, scope: Scope
) -> NDArray[np.bool_]:
    """(M,) track rows that lie on ignored truth, or on none in an ignored region.

    By one joint matching of all rows of a frame: all annotated rows compete, so that a track on a
    scored object beside an ignored one stays.
    """
    scene = both.only_pairs(close_pairs(both, tracks.kind, scope))
    match = pair_frames(scene, both.objects, keep=False)
    out = _in_regions(tracks.z[both.track_row], scope)
    paired = match >= 0
    out[scene.pair_row[match[paired]]] = False
    out[scene.pair_row[match[paired & ignored]]] = True
    return out


def _in_regions(z: Floats, scope: Scope) -> NDArray[np.bool_]:
    """(n,) whether centres are in an ignored region; its border belongs to it."""
    out = np.zeros(len(z), np.bool_)
    for region in scope.regions_ignored:
        out |= intersects_xy(region, z[:, 0], z[:, 1])
    return out


def counted_rows(tracks: Tracks, scope: Scope) -> NDArray[np.bool_]:
    """(n,) which track rows are output and count."""
    out = tracks.reported
    if scope.count_coasting is not None:
        coasting = tracks.state == TrackState.COASTING
        out = (out & ~coasting) | (coasting if scope.count_coasting else False)
    if scope.track_classes_left_out:
        codes = [k for k, name in enumerate(tracks.labels) if name in scope.track_classes_left_out]
        out = out & ~np.isin(tracks.label, codes)
    return out


def labelled(truth: Truth, wanted: tuple[str, ...] | None) -> NDArray[np.bool_]:
    """(n,) truth rows with one of these labels; None means any."""
    if wanted is None:
        return np.ones(len(truth), np.bool_)
    codes = [code for code, name in enumerate(truth.labels) if name in wanted]
    return np.isin(truth.label, codes)
