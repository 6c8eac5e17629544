"""Distance between the sets of objects and of tracks, frame by frame.

With c the cut-off, order p = 2 and the best pairs of a frame (those that minimise Σ (d² − c²)):

    GOSPA² = Σ d² + c²/2 (missed + false)                           Rahmathullah et al. 2017, α = 2
    OSPA²  = (Σ d² + c² (max(n, m) − pairs)) / max(n, m)                    Schuhmacher et al. 2008

The same pairs are best for both: in OSPA every unpaired row of the larger set costs c², paired
beyond the cut-off or not.
"""

from __future__ import annotations

import numpy as np
from numba import njit
from numpy.typing import NDArray

from tracker.kernels.clearmot import Scene
from tracker.kernels.matching import cheapest_matching


@njit(cache=True)
def set_pairs(scene: Scene, cut_off: float) -> tuple[NDArray[np.int64], NDArray[np.float64]]:
    """(F,) how many rows the best pairing of each frame pairs, (F,) the sum of their d².

    scene : with no pair further apart than the cut-off.
    """
    frames = len(scene.truth_start) - 1
    pairs = np.zeros(frames, np.int64)
    square = np.zeros(frames)
    for f in range(frames):
        a, b = scene.truth_start[f], scene.truth_start[f + 1]
        c, d = scene.track_start[f], scene.track_start[f + 1]
        first, last = scene.pair_start[a], scene.pair_start[b]
        if first == last:
            continue
        start = scene.pair_start[a : b + 1] - first
        column = scene.pair_row[first:last] - c
        cost = scene.distance[first:last] ** 2
        chosen, _ = cheapest_matching(start, column, cost, d - c, cut_off * cut_off, -1.0)
        for i in range(b - a):
            if chosen[i] >= 0:
                pairs[f] += 1
                square[f] += cost[chosen[i]]
    return pairs, square
