"""Higher order tracking accuracy: the counts it is made of, threshold by threshold.

Luiten et al. 2021, "HOTA: a higher order metric for evaluating multi-object tracking", IJCV 129.
At a threshold α a pair of similarity α or more may be a true positive c. Its association accuracy
is

    A(c) = TPA(c) / (TPA(c) + FNA(c) + FPA(c))

where TPA counts the true positives of the same object and the same track, and FNA and FPA the
other rows of the object and of the track. The pairs of a frame are those that maximise the sum of

    1/ε + A_max + ε S

(most pairs first, then association, then similarity S), A_max being A if all possible pairs of
this object and track were true positives (the paper's section on matching; from memory).
"""

from __future__ import annotations

import numpy as np
from numba import njit
from numpy.typing import NDArray

from tracker.kernels.clearmot import Scene
from tracker.kernels.matching import cheapest_matching

EPSILON = 1e-5


@njit(cache=True)
def hota_counts(
    scene: Scene,
    couple: NDArray[np.int64],
    couples: int,
    object_rows: NDArray[np.int64],
    track_rows: NDArray[np.int64],
    thresholds: NDArray[np.float64],
) -> tuple[NDArray[np.int64], NDArray[np.float64], NDArray[np.float64]]:
    """Count the true positives of each threshold.

    couple : (E,) number of the pair's (object, track), dense 0 … `couples` − 1.
    object_rows : (couples,) rows of the couple's object.   track_rows : (couples,) of its track.
    thresholds : (K,) α, above 0.

    Returns (K,) true positives, the sums of their A(c), and of their similarities.
    """
    hits = np.zeros(len(thresholds), np.int64)
    association = np.zeros(len(thresholds))
    similarity = np.zeros(len(thresholds))
    for k in range(len(thresholds)):
        possible = np.zeros(couples, np.int64)
        for e in range(len(couple)):
            possible[couple[e]] += scene.similarity[e] >= thresholds[k]
        found = np.zeros(couples, np.int64)
        match = np.full(len(scene.truth), -1, np.int64)
        similarity[k] = _match_frames(
            scene, couple, possible, found, match, object_rows, track_rows, thresholds[k]
        )
        for g in range(couples):
            if found[g] > 0:
                hits[k] += found[g]
                accuracy = found[g] / (object_rows[g] + track_rows[g] - found[g])
                association[k] += found[g] * accuracy
    return hits, association, similarity


@njit(cache=True)
def hota_by_frame(
    scene: Scene,
    couple: NDArray[np.int64],
    couples: int,
    object_rows: NDArray[np.int64],
    track_rows: NDArray[np.int64],
    thresholds: NDArray[np.float64],
) -> tuple[NDArray[np.int64], NDArray[np.float64], NDArray[np.float64]]:
    """What each frame adds to `hota_counts`, with the A(c) of the whole sequence.

    Arguments as there. Returns (F, K) true positives, sums of their A(c), and of their
    similarities.
    """
    frames = len(scene.truth_start) - 1
    hits = np.zeros((frames, len(thresholds)), np.int64)
    association = np.zeros((frames, len(thresholds)))
    similarity = np.zeros((frames, len(thresholds)))
    for k in range(len(thresholds)):
        possible = np.zeros(couples, np.int64)
        for e in range(len(couple)):
            possible[couple[e]] += scene.similarity[e] >= thresholds[k]
        found = np.zeros(couples, np.int64)
        match = np.full(len(scene.truth), -1, np.int64)
        _match_frames(scene, couple, possible, found, match, object_rows, track_rows, thresholds[k])
        for f in range(frames):
            for t in range(scene.truth_start[f], scene.truth_start[f + 1]):
                e = match[t]
                if e >= 0:
                    g = couple[e]
                    hits[f, k] += 1
                    association[f, k] += found[g] / (object_rows[g] + track_rows[g] - found[g])
                    similarity[f, k] += scene.similarity[e]
    return hits, association, similarity


@njit(cache=True)
def _match_frames(
    scene: Scene,
    couple: NDArray[np.int64],
    possible: NDArray[np.int64],
    found: NDArray[np.int64],
    match: NDArray[np.int64],
    object_rows: NDArray[np.int64],
    track_rows: NDArray[np.int64],
    threshold: float,
) -> float:
    """Match every frame, count true positives into `found`, return the sum of similarities.

    match : (T,) pair of each annotated row, -1 for none; filled.
    """
    total = 0.0
    for f in range(len(scene.truth_start) - 1):
        a, b = scene.truth_start[f], scene.truth_start[f + 1]
        c, d = scene.track_start[f], scene.track_start[f + 1]
        size = scene.pair_start[b] - scene.pair_start[a]
        if size == 0:
            continue
        start = np.zeros(b - a + 1, np.int64)
        column = np.empty(size, np.int64)
        cost = np.empty(size)
        origin = np.empty(size, np.int64)
        count = 0
        for t in range(a, b):
            for e in range(scene.pair_start[t], scene.pair_start[t + 1]):
                if scene.similarity[e] >= threshold:
                    g = couple[e]
                    shared = possible[g]
                    accuracy = shared / (object_rows[g] + track_rows[g] - shared)
                    column[count] = scene.pair_row[e] - c
                    cost[count] = -accuracy - EPSILON * scene.similarity[e]
                    origin[count] = e
                    count += 1
            start[t - a + 1] = count
        chosen, _ = cheapest_matching(
            start, column[:count], cost[:count], d - c, 1.0 / EPSILON, -1.0
        )
        for i in range(b - a):
            if chosen[i] >= 0:
                e = origin[chosen[i]]
                match[a + i] = e
                found[couple[e]] += 1
                total += scene.similarity[e]
    return total
