"""Lifecycle transitions against one-track-at-a-time words, and published initiation odds."""

import itertools

import numpy as np
import pytest

from tests.reference import lifecycle as twin
from tracker.kernels.lifecycle import advance, expire
from tracker.lifecycle.rules import Reason
from tracker.results.tracks import TrackState


def history(pairings, confirm_hits, confirm_window):
    """States and reasons of one track born before `pairings`, by the kernel."""
    state = np.array([TrackState.CONFIRMED if confirm_hits == 1 else TrackState.TENTATIVE], np.int8)
    hits = np.array([1])
    age = np.array([1])
    seen = np.array([0.0])
    out = []
    for k, paired in enumerate(pairings):
        reason = advance(
            state, hits, age, seen, np.array([paired]), k + 1.0, confirm_hits, confirm_window
        )
        out.append((TrackState(state[0]).word, Reason(reason[0]).words))
        if state[0] == TrackState.ENDED:
            break
    return out


@pytest.mark.parametrize(("m", "n"), [(1, 1), (2, 2), (2, 3), (3, 5), (4, 4)])
def test_every_short_history_as_the_twin_tells_it(m, n):
    for pairings in itertools.product([False, True], repeat=7):
        state, hits, age = ("confirmed" if m == 1 else "tentative"), 1, 1
        expected = []
        for paired in pairings:
            state, hits, age, reason = twin.advance(state, hits, age, paired, m, n)
            expected.append((state, reason))
            if state == "ended":
                break
        assert history(pairings, m, n) == expected


# Binomial sums at P_D = 0.9: at least M of N scans detect.
@pytest.mark.parametrize(("m", "n", "probability"), [(2, 3, 0.972), (3, 5, 0.99144)])
def test_initiation_probability_is_the_binomial_sum(m, n, probability):
    """Over all detection patterns of N scans, the first detection being the birth."""
    total = 0.0
    for pattern in itertools.product([False, True], repeat=n):
        weight = np.prod([0.9 if hit else 0.1 for hit in pattern])
        if sum(pattern) < m:
            continue
        # M of N holds: a track born at the first detection still has M − 1 more to come in time.
        born = pattern.index(True)
        states = [state for state, _ in history(pattern[born + 1 :], m, n)]
        assert "confirmed" in states
        total += weight
    assert total == pytest.approx(probability, abs=1e-9)


def test_expiry_is_not_decided_by_rounding():
    seen = np.array([0.0, 0.1, 2.0 - 1e-9])
    now = 0.1 + 1.0
    assert expire(np.zeros(3, np.int8), seen, now, 1.0).tolist() == [True, False, False]
    assert [twin.expire(value, now, 1.0) for value in seen] == [True, False, False]
