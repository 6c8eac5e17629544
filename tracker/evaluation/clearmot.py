"""CLEAR MOT counts by compiled kernels (Bernardin and Stiefelhagen 2008)."""

from __future__ import annotations

import numpy as np
from scipy.optimize import linear_sum_assignment

from tracker.kernels.clearmot import (
    Lifetimes,
    Scene,
    count_lifetimes,
    pair_over_time,
    settle_frame,
)
from tracker.log.model import Ints

# In a frame with more possible pairs a tie keeps our own answer: the dense matrix of the referee
# would not fit into memory.
LARGEST_MATRIX = 25_000_000


def pair_frames(scene: Scene, objects: int, *, keep: bool = True) -> Ints:
    """(T,) pair of each annotated row, -1 for none.

    keep : whether earlier pairings last (CLEAR MOT), or each frame stands alone.

    Where equally close pairings compete, the choice is that of scipy's dense solver on the whole
    frame, which is the referee's.
    """
    partner = np.full(objects, -1, np.int64)
    match = np.full(len(scene.truth), -1, np.int64)
    frames = len(scene.truth_start) - 1
    f = pair_over_time(scene, keep, partner, match, 0)
    while f < frames:
        size = np.diff(scene.truth_start[f : f + 2]) * np.diff(scene.track_start[f : f + 2])
        if size[0] > LARGEST_MATRIX:
            settle_frame(scene, keep, partner, match, f, True)
        else:
            _settle_tie(scene, partner, match, f)
        f = pair_over_time(scene, keep, partner, match, f + 1)
    return match


def lifetimes(scene: Scene, match: Ints, objects: int) -> Lifetimes:
    """Rows, paired rows, switches and gaps of each object."""
    return count_lifetimes(scene, match, objects)


def _settle_tie(scene: Scene, partner: Ints, match: Ints, f: int) -> None:
    """Pair what is left of frame `f` as the referee does: densely, with kept rows ruled out."""
    a, b = int(scene.truth_start[f]), int(scene.truth_start[f + 1])
    c, d = int(scene.track_start[f]), int(scene.track_start[f + 1])
    cost = np.full((b - a, d - c), np.nan)
    pair = np.full((b - a, d - c), -1, np.int64)
    kept = match[a:b][match[a:b] >= 0]
    for t in range(a, b):
        if match[t] < 0:
            of = slice(int(scene.pair_start[t]), int(scene.pair_start[t + 1]))
            cost[t - a, scene.pair_row[of] - c] = scene.distance[of]
            pair[t - a, scene.pair_row[of] - c] = np.arange(of.start, of.stop)
    cost[:, scene.pair_row[kept] - c] = np.nan
    allowed = np.isfinite(cost)
    # More than re-pairing every row can cost, so that as many pairs as possible are made.
    ruled_out = 2.0 * min(cost.shape) * (cost[allowed].max() + 1.0) + 1.0
    rows, columns = linear_sum_assignment(np.where(allowed, cost, ruled_out))
    for i, j in zip(rows.tolist(), columns.tolist(), strict=True):
        if allowed[i, j]:
            match[a + i] = pair[i, j]
            partner[scene.truth[a + i]] = scene.track[c + j]
