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
    state: NDArray[np.int8],
    last_seen: NDArray[np.float64],
    now: float,
    coast_seconds: float,
) -> NDArray[np.bool_]:
    """(n,) tracks whose last detection is older than the coasting limit."""
    out = np.empty(len(state), np.bool_)
    for i in range(len(state)):
        out[i] = now - last_seen[i] > coast_seconds + CLOCK_SLACK_SECONDS
    return out


@njit(cache=True)
def advance(
    state: NDArray[np.int8],
    hits: NDArray[np.int64],
    age: NDArray[np.int64],
    last_seen: NDArray[np.float64],
    paired: NDArray[np.bool_],
    now: float,
    confirm_hits: int,
    confirm_window: int,
) -> NDArray[np.int8]:
    """Move every track to its next state, in place; returns the (n,) reasons.

    hits, age : detections and frames since birth, the birth included.
    """
    reason = np.zeros(len(state), np.int8)
    for i in range(len(state)):
        age[i] += 1
        if paired[i]:
            hits[i] += 1
            last_seen[i] = now
            if state[i] == COASTING:
                state[i] = CONFIRMED
                reason[i] = FOUND_AGAIN
            elif state[i] == TENTATIVE and hits[i] >= confirm_hits:
                state[i] = CONFIRMED
                reason[i] = HITS_REACHED
        elif state[i] == CONFIRMED:
            state[i] = COASTING
            reason[i] = MISSED
        if state[i] == TENTATIVE and hits[i] + (confirm_window - age[i]) < confirm_hits:
            state[i] = ENDED
            reason[i] = HITS_OUT_OF_REACH
    return reason
