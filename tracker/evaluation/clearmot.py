"""CLEAR MOT and identity counts by compiled kernels."""

from __future__ import annotations

import numpy as np
from scipy.optimize import linear_sum_assignment
from scipy.sparse import csr_array
from scipy.sparse.csgraph import min_weight_full_bipartite_matching

from tracker.evaluation.scores import Counts
from tracker.kernels.clearmot import Scene, count_lifetimes, keep_pairs, pair_over_time
from tracker.log.model import Ints

# Larger frames keep our own answer to a tie: the dense matrix would not fit into memory.
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
    f = 0
    while True:
        f = pair_over_time(scene, keep, partner, match, f)
        if f >= frames:
            return match
        _settle_tie(scene, keep, partner, match, f)
        f += 1


def _settle_tie(scene: Scene, keep: bool, partner: Ints, match: Ints, f: int) -> None:
    """Pair what is left of frame `f` once more, as the referee does."""
    a, b = int(scene.truth_start[f]), int(scene.truth_start[f + 1])
    c, d = int(scene.track_start[f]), int(scene.track_start[f + 1])
    if (b - a) * (d - c) > LARGEST_MATRIX:
        return
    # The kernel has paired the leftover already, but that never changes what is kept: an object
    # whose last track is still possible and free was kept, so its partner is as before.
    taken = np.zeros(d - c, np.bool_)
    before = _partners_before(scene, partner, match, f)
    match[a:b] = -1
    if keep:
        keep_pairs(scene, before, match, f, taken)
    cost = np.full((b - a, d - c), np.nan)
    pair = np.full((b - a, d - c), -1, np.int64)
    for t in range(a, b):
        if match[t] < 0:
            of = slice(int(scene.pair_start[t]), int(scene.pair_start[t + 1]))
            cost[t - a, scene.pair_row[of] - c] = scene.distance[of]
            pair[t - a, scene.pair_row[of] - c] = np.arange(of.start, of.stop)
    cost[:, taken] = np.nan
    allowed = np.isfinite(cost)
    worth = 2.0 * min(cost.shape) * (np.abs(cost[allowed]).max() + 1.0) + 1.0
    rows, columns = linear_sum_assignment(np.where(allowed, cost, worth))
    partner[scene.truth[a:b]] = before[scene.truth[a:b]]
    for i, j in zip(rows.tolist(), columns.tolist(), strict=True):
        if allowed[i, j]:
            match[a + i] = pair[i, j]
            partner[scene.truth[a + i]] = scene.track[c + j]
