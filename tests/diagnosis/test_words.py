"""Numbers in words."""

from __future__ import annotations

import math

import pytest

from tracker.diagnosis.explanation import Change, Gate
from tracker.diagnosis.words import changes_words, gate_words, nats, odds, probability_beyond


@pytest.mark.parametrize(
    ("margin", "words"),
    [
        (0.0, "even"), (0.05, "1.05:1"), (math.log(1.5), "1.5:1"), (math.log(9.9), "9.9:1"),
        (math.log(10.0), "10:1"), (2.3, "10:1"), (math.log(234.0), "230:1"), (4.6, "99:1"),
        (math.log(3000.0), "3,000:1"), (math.log(999_000.0), "1,000,000:1"),
        (math.log(1e6), "over 1,000,000:1"), (800.0, "over 1,000,000:1"),
        (None, "no alternative"), (math.inf, "no alternative"), (-1e-12, "even"),
    ],
)  # fmt: skip
def test_odds(margin, words):
    assert odds(margin) == words


@pytest.mark.parametrize(
    ("value", "words"), [(None, "?"), (math.inf, "inf"), (-0.001, "0.00"), (-1.236, "-1.24")]
)
def test_nats(value, words):
    assert nats(value) == words


@pytest.mark.parametrize(
    ("tail", "words"),
    [(0.5, "0.50"), (0.05, "0.950"), (1e-3, "0.9990"), (3.3e-5, "0.999967"), (8e-7, "1 − 8e-07")],
)
def test_probabilities_near_one(tail, words):
    assert probability_beyond(tail) == words


def test_changes():
    changes = (Change(7, 3, 5), Change(9, 5, None), Change(None, 3, None))
    assert changes_words(changes, {3: 40, 5: None}.get) == (
        "track 7 takes detection 5, track 9 is missed, detection 3 (line 40) is left over"
    )


def gate(**changes):
    values = {
        "distance": 4.0, "distance_limit": 9.0, "gate_probability": 0.99, "tail_needed": 0.1,
        "overlap": 0.5, "overlap_floor": 0.3, "inside": True, "source": "ledger",
    }  # fmt: skip
    return Gate(**values | changes)


def test_inside():
    assert gate_words(gate()) == "inside the gate: d² 4 of at most 9, IoU 0.50 of at least 0.3"


def test_outside_by_both():
    words = gate_words(gate(distance=36.0, overlap=0.1, inside=False, tail_needed=1e-20))
    assert words == (
        "outside the gate: d² is 36, the limit 9 (P_G 0.99), 2 times its radius; no gate "
        "probability would have admitted it; IoU is 0.1, the floor 0.3"
    )


def test_outside_by_the_floor_alone():
    words = gate_words(gate(distance_limit=None, gate_probability=None, overlap=0, inside=False))
    assert words == "outside the gate: IoU is 0, the floor 0.3"
