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
EVIDENCE_REACHED = 7
EVIDENCE_GONE = 8
UNDECIDED = 9
LEFT_VIEW = 10

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
def advance_by_evidence(
    state: NDArray[np.int8],
    hits: NDArray[np.int64],
    age: NDArray[np.int64],
    last_seen: NDArray[np.float64],
    log_confidence: NDArray[np.float64],
    evidence: NDArray[np.float64],
    pairing: NDArray[np.int64],
    now: float,
    confirm_at: float,
    drop_at: float,
    undecided_frames: int,
) -> tuple[NDArray[np.int64], NDArray[np.int8], NDArray[np.int8], int]:
    """As `advance`, by Wald's sequential test on the log-odds that there is an object.

    evidence : (n,) log-odds after this frame; capped at `confirm_at` in place, so that what was
    seen long ago does not keep alive what is gone.   confirm_at, drop_at : thresholds in nats.
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
        paired = pairing[i] >= 0
        if paired:
            hits[i] += 1
            last_seen[i] = now
        if evidence[i] <= drop_at:
            state[i] = ENDED
            why = EVIDENCE_GONE
        elif was == TENTATIVE and evidence[i] >= confirm_at and paired:
            state[i] = CONFIRMED
            why = EVIDENCE_REACHED
            log_confidence[i] = 0.0
        elif was == TENTATIVE and age[i] >= undecided_frames:
            state[i] = ENDED
            why = UNDECIDED
        elif was == COASTING and paired:
            state[i] = CONFIRMED
            why = FOUND_AGAIN
        elif was == CONFIRMED and not paired:
            state[i] = COASTING
            why = MISSED
        evidence[i] = min(evidence[i], confirm_at)
        if state[i] == ENDED:
            ended += 1
        if why != UNCHANGED:
            changed[count] = i
            before[count] = was
            reason[count] = why
            count += 1
    return changed[:count], before[:count], reason[:count], ended


@njit(cache=True)
def gather_evidence(
    evidence: NDArray[np.float64],
    rows: NDArray[np.int64],
    row_candidate: NDArray[np.int64],
    cost: NDArray[np.float64],
    miss: NDArray[np.float64],
) -> None:
    """Add what a tier's decisions say for each track, in place: minus its cost or its miss cost.

    evidence : (n,).   rows : (k,) table rows.   row_candidate : (k,) chosen candidate, -1 for
    none.   cost : (E,), miss : (k,) in nats.
    """
    for k in range(len(rows)):
        e = row_candidate[k]
        evidence[rows[k]] -= cost[e] if e >= 0 else miss[k]


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
