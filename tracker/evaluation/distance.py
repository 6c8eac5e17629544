"""Distances by which rows of truth and tracks are paired."""

from __future__ import annotations

import numpy as np

from tracker.evaluation.frames import FramePair
from tracker.kernels.overlap import overlap_matrix
from tracker.log.model import Floats, Kind


def distances(
    pair: FramePair, kind: Kind, iou_threshold: float, distance_threshold: float | None
) -> Floats:
    """(n, m) distances of a frame, nan where a pair is out of the question.

    Boxes: 1 − IoU, nan below the IoU threshold. Points: Euclidean, nan beyond the threshold.
    """
    if not len(pair.truth) or not len(pair.track):
        return np.empty((len(pair.truth), len(pair.track)))
    if kind is Kind.BOX:
        overlap = overlap_matrix(pair.truth_z, pair.track_z)
        return np.where(overlap >= iou_threshold, 1.0 - overlap, np.nan)
    apart = np.linalg.norm(pair.truth_z[:, None] - pair.track_z[None], axis=2)
    return np.where(apart <= (distance_threshold or np.inf), apart, np.nan)
