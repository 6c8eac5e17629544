"""Lifecycle transitions of all tracks of a frame (the table itself is in lifecycle/rules.py)."""

from __future__ import annotations

import numpy as np
from numba import njit
from numpy.typing import NDArray

# States, as in tracker.results.tracks.TrackState.
TENTATIVE = 0
CONFIRMED = 1
COASTING = 2
ENDED = 3

# Reasons, as in tracker.lifecycle.rules.Reason.
UNCHANGED = 0
BORN = 1
HITS_REACHED = 2
MISSED = 3
FOUND_AGAIN = 4
HITS_OUT_OF_REACH = 5
COAST_LIMIT = 6

# Times are seconds of a clock; a limit is not missed by rounding in the last digits.
CLOCK_SLACK_SECONDS = 1e-6


@njit(cache=True)
def expire(
    last_seen: NDArray[np.float64], now: float, coast_seconds: float
) -> tuple[NDArray[np.bool_], int]:
    """(n,) tracks whose last detection is older than the coasting limit, and how many."""
    out = np.empty(len(last_seen), np.bool_)
    count = 0
    for i in range(len(last_seen)):
        out[i] = now - last_seen[i] > coast_seconds + CLOCK_SLACK_SECONDS
        count += out[i]
    return out, count


@njit(cache=True)
def advance(
    state: NDArray[np.int8],
    hits: NDArray[np.int64],
    age: NDArray[np.int64],
    last_seen: NDArray[np.float64],
    log_confidence: NDArray[np.float64],
    pairing: NDArray[np.int64],
    now: float,
    confirm_hits: int,
    confirm_window: int,
) -> tuple[NDArray[np.int64], NDArray[np.int8], NDArray[np.int8], int]:
    """Move every track to its next state, in place.

    hits, age : detections and frames since birth, the birth included.   log_confidence : set to 0
    at confirmation, since identity is claimed from there on.   pairing : (n,) the detection of
    each track, -1 for none.

    Returns the (k,) tracks that changed, their states before, the reasons, and how many ended.
    """
    changed = np.empty(len(state), np.int64)
    before = np.empty(len(state), np.int8)
    reason = np.empty(len(state), np.int8)
    count = 0
    ended = 0
    for i in range(len(state)):
        age[i] += 1
        was = state[i]
        why = UNCHANGED
        if pairing[i] >= 0:
            hits[i] += 1
            last_seen[i] = now
            if was == COASTING:
                state[i] = CONFIRMED
                why = FOUND_AGAIN
            elif was == TENTATIVE and hits[i] >= confirm_hits:
                state[i] = CONFIRMED
                why = HITS_REACHED
                log_confidence[i] = 0.0
        elif was == CONFIRMED:
            state[i] = COASTING
            why = MISSED
        if state[i] == TENTATIVE and hits[i] + (confirm_window - age[i]) < confirm_hits:
            state[i] = ENDED
            why = HITS_OUT_OF_REACH
            ended += 1
        if why != UNCHANGED:
            changed[count] = i
            before[count] = was
            reason[count] = why
            count += 1
    return changed[:count], before[:count], reason[:count], ended


@njit(cache=True)
def take_over(
    score: NDArray[np.float64],
    label: NDArray[np.int32],
    pairing: NDArray[np.int64],
    detection_score: NDArray[np.float64],
    detection_label: NDArray[np.int32],
) -> int:
    """Give tracks the score of their detection, and its label if they have none; in place.

    Returns how many tracks are paired.
    """
    paired = 0
    for i in range(len(pairing)):
        j = pairing[i]
        if j >= 0:
            paired += 1
            score[i] = detection_score[j]
            if label[i] < 0:
                label[i] = detection_label[j]
    return paired


@njit(cache=True)
def weigh(
    log_confidence: NDArray[np.float64], rows: NDArray[np.int64], margin: NDArray[np.float64]
) -> None:
    """Identity confidence times 1 / (1 + exp(−margin)) for the decision about each row; in place.

    log_confidence : (n,).   rows, margin : (k,) table rows, margins of their decisions in nats.
    """
    for k in range(len(rows)):
        log_confidence[rows[k]] -= np.log1p(np.exp(-margin[k]))
