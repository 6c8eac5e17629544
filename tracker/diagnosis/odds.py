"""Nats in words: a margin of m nats means odds of e^m to 1."""

from __future__ import annotations

import math

LARGEST = 1e6  # beyond this the model is not right often enough to tell odds apart


def odds(nats: float | None) -> str:
    """'2.5:1', '3,000:1', 'even' for a tie, 'over 1,000,000:1'; two digits are said, no more.

    None and inf stand for a decision that nothing could have replaced.
    """
    if nats is None or math.isinf(nats) or math.isnan(nats):
        return "no alternative"
    if nats >= math.log(LARGEST):
        return f"over {LARGEST:,.0f}:1"
    value = math.exp(max(nats, 0.0))
    if value < 1.005:
        return "even"
    if value < 9.95:
        return f"{value:.2g}:1" if value >= 1.095 else f"{value:.2f}:1"
    digits = math.floor(math.log10(value)) - 1
    return f"{round(value, -digits):,.0f}:1"


def probability_words(tail: float) -> str:
    """A probability 1 − tail with as many nines as it needs."""
    if tail >= 1e-5:
        return f"{1.0 - tail:.{max(2, 1 - math.floor(math.log10(tail)))}g}"
    return f"1 − {tail:.0e}" if tail > 0.0 else "1"
