"""Which detection came from which annotated object."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import linear_sum_assignment

from tracker.errors import InputError, UsageError
from tracker.evaluation.frames import aligned_frames
from tracker.kernels.pairing import pair_boxes, pair_points
from tracker.log.model import DetectionLog, Floats, Ints, Kind, Truth
from tracker.results.tracks import Tracks, TrackState

LEAST_IOU = 0.5
BEYOND = 10.0  # cost that no pair has: pairs are made wherever one is possible


@dataclass(frozen=True, slots=True, eq=False)
class Matched:
    """Detections of one log beside its truth.

    position : (P,) index of the frame in the log.   thing, detection : (P,) rows of truth and log.
    missed : rows of the truth without a detection.   false : rows of the log without an object.
    truth_position : (T,) index of each truth row's frame, -1 where the log lacks the frame.
    Truth that is not to be scored, and the detections of it, are in none of these.
    """

    log: DetectionLog
    truth: Truth
    position: Ints
    thing: Ints
    detection: Ints
    missed: Ints
    false: Ints
    truth_position: Ints
    frames: Ints  # positions of frames that both have

    def __len__(self) -> int:
        return len(self.thing)

    @property
    def residual(self) -> Floats:
        """(P, d) detection minus truth, in the log's unit."""
        return self.log.z[self.detection] - self.truth.z[self.thing]


def match(log: DetectionLog, truth: Truth, distance_threshold: float | None = None) -> Matched:
    """Optimal one-to-one assignment in each frame: as many pairs as possible, nearest together.

    Boxes are paired at an IoU of 0.5 or more, points at most `distance_threshold` apart.

    Raises UsageError for kinds that differ or points without a threshold, InputError if nothing
    matches.
    """
    if log.kind is not truth.kind:
        raise UsageError(
            f"'{log.name}' has {log.kind} detections, its truth is of kind {truth.kind}"
        )
    if log.kind is Kind.POINT and distance_threshold is None:
        raise UsageError("points need --distance-threshold, in the log's length unit")
    frame = np.repeat(log.frame_numbers, np.diff(log.offsets))
    number = aligned_frames(_as_tracks(log, frame), truth)
    at = np.clip(np.searchsorted(log.frame_numbers, number), 0, max(0, log.frame_count - 1))
    position = np.where(log.frame_numbers[at] == number, at, -1)
    order = np.flatnonzero(position >= 0)
    order = order[np.argsort(position[order], kind="stable")]
    there = np.unique(position[order])
    scored = order[truth.scored[order]]
    pairs = _assign(log, truth, scored, position, np.ones(len(log), np.bool_), distance_threshold)
    free = np.ones(len(log), np.bool_)
    free[pairs[1]] = False
    ignored = order[~truth.scored[order]]
    free[_assign(log, truth, ignored, position, free, distance_threshold)[1]] = False
    if not len(pairs[0]):
        raise InputError(
            f"no detection of '{log.name}' matches its truth",
            path=truth.path,
            remedy="Do frame numbers and units agree? "
            "For points, is the distance threshold wide enough?",
        )
    within = np.isin(np.repeat(np.arange(log.frame_count), np.diff(log.offsets)), there)
    return Matched(
        log, truth, position[pairs[0]], *pairs,
        missed=np.setdiff1d(scored, pairs[0]), false=np.flatnonzero(free & within),
        truth_position=position, frames=there,
    )  # fmt: skip


def _assign(
    log: DetectionLog,
    truth: Truth,
    rows: Ints,
    position: Ints,
    free: NDArray[np.bool_],
    reach: float | None,
) -> tuple[Ints, Ints]:
    """Rows of truth and log that belong together; only `free` detections are given away."""
    start = np.searchsorted(position[rows], np.arange(log.frame_count + 1))
    z = np.ascontiguousarray(truth.z[rows])
    if log.kind is Kind.BOX:
        first, column, closeness = pair_boxes(start, z, log.offsets, log.z, LEAST_IOU)
        far = 1.0 - closeness
    else:
        assert reach is not None
        first, column, distance = pair_points(start, z, log.offsets, log.z, reach)
        far = distance / reach
    things: list[Ints] = []
    detections: list[Ints] = []
    for k in range(log.frame_count):
        a, b, c, d = start[k], start[k + 1], log.offsets[k], log.offsets[k + 1]
        pair = np.arange(first[a], first[b])
        pair = pair[free[column[pair]]]
        if not len(pair):
            continue
        of = np.searchsorted(first, pair, side="right") - 1
        cost = np.full((b - a, d - c), BEYOND)
        cost[of - a, column[pair] - c] = far[pair]
        i, j = linear_sum_assignment(cost)
        kept = cost[i, j] < BEYOND
        things.append(rows[a + i[kept]])
        detections.append(c + j[kept])
    none = np.zeros(0, np.int64)
    return np.concatenate([none, *things]), np.concatenate([none, *detections])


def _as_tracks(log: DetectionLog, frame: Ints) -> Tracks:
    """The log's detections in the form in which frames are aligned with those of the truth."""
    n = len(log)
    return Tracks(
        name=log.name, kind=log.kind, facts=log.facts, frame=frame,
        time=np.repeat(log.frame_times, np.diff(log.offsets)), track=np.arange(n), z=log.z,
        score=log.score, label=log.label, labels=log.labels,
        state=np.full(n, TrackState.CONFIRMED, np.int8), reported=np.ones(n, np.bool_),
        line=log.line,
    )  # fmt: skip
