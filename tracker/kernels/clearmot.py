"""Pair tracks with objects over time, and count, as CLEAR MOT has it.

Bernardin and Stiefelhagen 2008, §2.1: a pairing lasts as long as it is possible; what is left of a
frame is paired as completely and then as closely as possible.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numba import njit
from numpy.typing import NDArray

from tracker.kernels.matching import cheapest_matching

# Costs that differ by less, relative to what a pair is worth, are a tie: a solver that adds and
# subtracts numbers of that size cannot tell them apart for sure.
TIE = 1e-12


class Scene(NamedTuple):
    """Objects and tracks of a sequence, in frames, with every pair that is possible.

    Rows of one frame are sorted by identity; identities are dense, 0 … and once a frame.
    """

    truth_start: NDArray[np.int64]  # (F + 1,) first annotated row of each frame
    truth: NDArray[np.int64]  # (T,) object
    track_start: NDArray[np.int64]  # (F + 1,) first track row of each frame
    track: NDArray[np.int64]  # (M,) track
    pair_start: NDArray[np.int64]  # (T + 1,) first pair of each annotated row
    pair_row: NDArray[np.int64]  # (E,) track row, increasing within an annotated row
    distance: NDArray[np.float64]  # (E,) of the pair
    similarity: NDArray[np.float64]  # (E,) of the pair, 0 to 1


class Lifetimes(NamedTuple):
    """What was counted of each object."""

    rows: NDArray[np.int64]  # (O,) annotated
    paired: NDArray[np.int64]  # (O,) of them with a track
    switches: NDArray[np.int64]  # (O,) pairings with another track than the last
    gaps: NDArray[np.int64]  # (O,) unpaired stretches between paired ones


@njit(cache=True)
def pair_over_time(
    scene: Scene,
    keep: bool,
    partner: NDArray[np.int64],
    match: NDArray[np.int64],
    first: int,
) -> int:
    """Pair the frames from `first` on, up to one where equally close pairings compete.

    keep : whether earlier pairings last; if not, each frame stands alone.
    partner : (O,) track each object was paired with last, -1 for none; brought up to date.
    match : (T,) pair of each annotated row, -1 for none; filled.

    Returns the frame whose leftover has a tie, with nothing but its kept pairs filled in, or F at
    the end.
    """
    frames = len(scene.truth_start) - 1
    for f in range(first, frames):
        if settle_frame(scene, keep, partner, match, f, False):
            return f
    return frames


@njit(cache=True)
def settle_frame(
    scene: Scene,
    keep: bool,
    partner: NDArray[np.int64],
    match: NDArray[np.int64],
    f: int,
    any_answer: bool,
) -> bool:
    """Pair one frame, as `pair_over_time`; returns whether its leftover has a tie.

    any_answer : whether to pair the leftover even then.
    """
    a, b = scene.truth_start[f], scene.truth_start[f + 1]
    c, d = scene.track_start[f], scene.track_start[f + 1]
    match[a:b] = -1
    if a == b or c == d:
        return False
    taken = np.zeros(d - c, np.bool_)
    if keep:
        keep_pairs(scene, partner, match, f, taken)
    # What is left, with the largest distance for the worth of a pair.
    start = np.zeros(b - a + 1, np.int64)
    size = scene.pair_start[b] - scene.pair_start[a]
    column = np.empty(size, np.int64)
    cost = np.empty(size)
    origin = np.empty(size, np.int64)
    count = 0
    largest = 0.0
    for t in range(a, b):
        if match[t] < 0:
            for e in range(scene.pair_start[t], scene.pair_start[t + 1]):
                j = scene.pair_row[e] - c
                if not taken[j]:
                    column[count] = j
                    cost[count] = scene.distance[e]
                    origin[count] = e
                    largest = max(largest, scene.distance[e])
                    count += 1
        start[t - a + 1] = count
    if count == 0:
        return False
    # Re-pairing every row costs less than one pair more is worth.
    reward = 2.0 * min(b - a, d - c) * (largest + 1.0) + 1.0
    chosen, tied = cheapest_matching(
        start, column[:count], cost[:count], d - c, reward, TIE * reward
    )
    if tied and not any_answer:
        return True
    for t in range(a, b):
        e = chosen[t - a]
        if e >= 0:
            match[t] = origin[e]
            partner[scene.truth[t]] = scene.track[scene.pair_row[origin[e]]]
    return tied


@njit(cache=True)
def keep_pairs(
    scene: Scene,
    partner: NDArray[np.int64],
    match: NDArray[np.int64],
    f: int,
    taken: NDArray[np.bool_],
) -> None:
    """Keep each object's last pairing where it is possible, objects in order.

    taken : (m,) which track rows of the frame are paired; filled.
    """
    c = scene.track_start[f]
    for t in range(scene.truth_start[f], scene.truth_start[f + 1]):
        last = partner[scene.truth[t]]
        if last < 0:
            continue
        for e in range(scene.pair_start[t], scene.pair_start[t + 1]):
            j = scene.pair_row[e]
            if scene.track[j] == last and not taken[j - c]:
                match[t] = e
                taken[j - c] = True
                break


@njit(cache=True)
def count_lifetimes(scene: Scene, match: NDArray[np.int64], objects: int) -> Lifetimes:
    """Count what happened to each of the objects 0 … `objects` − 1.

    match : (T,) pair of each annotated row, -1 for none.

    An object that is not annotated for a while has no gap there, but comes back to its last
    pairing: another track then is a switch.
    """
    out = Lifetimes(
        np.zeros(objects, np.int64),
        np.zeros(objects, np.int64),
        np.zeros(objects, np.int64),
        np.zeros(objects, np.int64),
    )
    partner = np.full(objects, -1, np.int64)
    missing = np.zeros(objects, np.bool_)  # since its last pairing
    for t in range(len(scene.truth)):
        k = scene.truth[t]
        out.rows[k] += 1
        if match[t] < 0:
            missing[k] = True
            continue
        track = scene.track[scene.pair_row[match[t]]]
        out.paired[k] += 1
        if partner[k] >= 0:
            out.switches[k] += partner[k] != track
            out.gaps[k] += missing[k]
        partner[k] = track
        missing[k] = False
    return out
