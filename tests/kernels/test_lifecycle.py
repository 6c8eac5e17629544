"""Lifecycle transitions against one-track-at-a-time words, and published initiation odds."""

import itertools
import math

import numpy as np
import pytest

from tests.reference import lifecycle as twin
from tracker.kernels.lifecycle import (
    advance,
    advance_by_evidence,
    expire,
    gather_evidence,
    take_over,
    weigh,
)
from tracker.lifecycle.rules import Reason
from tracker.results.tracks import TrackState


def history(pairings, confirm_hits, confirm_window):
    """States and reasons of one track born before `pairings`, by the kernel."""
    state = np.array([TrackState.CONFIRMED if confirm_hits == 1 else TrackState.TENTATIVE], np.int8)
    hits = np.array([1])
    age = np.array([1])
    seen = np.array([0.0])
    out = []
    confidence = np.array([-1.0])
    for k, paired in enumerate(pairings):
        was = state[0]
        pairing = np.array([0 if paired else -1])
        changed, before, reasons, ended = advance(
            state, hits, age, seen, confidence, pairing, k + 1.0, confirm_hits, confirm_window
        )
        assert len(changed) == len(before) == len(reasons)
        assert (before == was).all()
        assert ended == (state[0] == TrackState.ENDED)
        reason = reasons if len(reasons) else [Reason.UNCHANGED]
        assert confidence[0] == (0.0 if reason[0] == Reason.HITS_REACHED else confidence[0])
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


@pytest.mark.parametrize("seed", range(40))
def test_every_walk_of_evidence_as_the_twin_tells_it(seed):
    rng = np.random.default_rng(seed)
    state, hits, age = np.zeros(1, np.int8), np.array([1]), np.array([1])
    seen, confidence, evidence = np.zeros(1), np.array([-1.0]), np.zeros(1)
    told = ("tentative", 1, 0.0)
    for frame in range(12):
        paired = bool(rng.random() < 0.6)
        gain = rng.normal(1.0 if paired else -1.5, 1.5)
        evidence += gain
        changed, _, reasons, ended = advance_by_evidence(
            state, hits, age, seen, confidence, evidence,
            np.array([0 if paired else -1]), frame + 1.0, 4.0, -3.0, 9,
        )  # fmt: skip
        told = twin.advance_by_evidence(told[0], told[1], paired, told[2] + gain, 4.0, -3.0, 9)
        reason = Reason(reasons[0]).words if len(changed) else "unchanged"
        assert (TrackState(state[0]).word, reason) == (told[0], told[3])
        assert evidence[0] == pytest.approx(told[2])
        told = told[:3]
        assert ended == (told[0] == "ended")
        if ended:
            break


def test_evidence_is_what_the_decisions_cost():
    evidence = np.array([1.0, 2.0, 3.0])
    chosen, cost, miss = np.array([1, -1]), np.array([9.0, -4.0]), np.array([2.3, 1.5])
    expected = twin.gather_evidence(evidence, [2, 0], chosen, cost, miss)
    gather_evidence(evidence, np.array([2, 0]), chosen, cost, miss)
    assert evidence.tolist() == expected == [-0.5, 2.0, 7.0]


def test_expiry_is_not_decided_by_rounding():
    seen = np.array([0.0, 0.1, 2.0 - 1e-9])
    now = 0.1 + 1.0
    late, count = expire(seen, now, 1.0)
    assert late.tolist() == [True, False, False]
    assert count == 1
    assert [twin.expire(value, now, 1.0) for value in seen] == [True, False, False]


def test_take_over():
    score, label = np.array([0.1, 0.2, 0.3]), np.array([-1, 4, -1], np.int32)
    pairing = np.array([1, 0, -1])
    seen_score, seen_label = np.array([0.8, 0.9]), np.array([5, 6], np.int32)
    expected = twin.take_over(score, label, pairing, seen_score, seen_label)
    assert take_over(score, label, pairing, seen_score, seen_label) == 2
    assert (score.tolist(), label.tolist()) == expected == ([0.9, 0.8, 0.3], [6, 4, -1])


def test_weigh_turns_margins_into_probabilities():
    log_confidence = np.log([0.5, 1.0, 0.8])
    rows, margin = np.array([0, 2, 1]), np.array([0.0, math.log(9.0), np.inf])
    weigh(log_confidence, rows, margin)
    expected = twin.weigh([0.5, 1.0, 0.8], rows, margin)
    np.testing.assert_allclose(np.exp(log_confidence), expected, rtol=1e-12)
    np.testing.assert_allclose(expected, [0.25, 1.0, 0.72], rtol=1e-12)  # by hand
