"""Numbers of an explanation in words."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable

from tracker.diagnosis.explanation import Change, Gate

LARGEST_ODDS = 1e6  # beyond this no model is right often enough to tell odds apart
LEAST_TAIL = 1e-12  # a gate probability nearer to 1 is no setting

LineOf = Callable[[int | None], int | None]


def odds(nats: float | None) -> str:
    """'2.5:1', '3,000:1', 'even' for a tie, 'over 1,000,000:1'; two digits are said, no more.

    None and inf stand for a decision that nothing could have replaced.
    """
    if nats is None or not math.isfinite(nats):
        return "no alternative"
    if nats >= math.log(LARGEST_ODDS):
        return f"over {LARGEST_ODDS:,.0f}:1"
    value = math.exp(max(nats, 0.0))
    if value < 1.005:
        return "even"
    if value < 1.095:
        return f"{value:.2f}:1"
    if value < 9.95:
        return f"{value:.1f}:1"
    digits = math.floor(math.log10(value)) - 1
    return f"{round(value, -digits):,.0f}:1"


def nats(value: float | None) -> str:
    """A cost or margin with two decimals."""
    if value is None or math.isnan(value):
        return "?"
    if math.isinf(value):
        return "inf"
    return f"{0.0 if abs(value) < 0.005 else value:.2f}"  # no '-0.00'


def probability_beyond(tail: float) -> str:
    """A probability 1 − tail with as many digits as tell it from 1."""
    if tail < 1e-6:
        return f"1 − {tail:.0e}"
    return f"{1.0 - tail:.{max(2, 1 - math.floor(math.log10(tail)))}f}"


def detection_name(detection: int | None, line: int | None) -> str:
    """'detection 3 (line 412)'."""
    return f"detection {detection}" + ("" if line is None else f" (line {line})")


def changes_words(changes: Iterable[Change], line_of: LineOf) -> str:
    """'track 7 takes detection 5, track 9 is missed, detection 3 is left over'."""
    return ", ".join(_change(item, line_of) for item in changes)


def _change(change: Change, line_of: LineOf) -> str:
    if change.track is None:
        return f"{detection_name(change.before, line_of(change.before))} is left over"
    if change.after is None:
        return f"track {change.track} is missed"
    return f"track {change.track} takes {detection_name(change.after, line_of(change.after))}"


def gate_words(gate: Gate) -> str:
    """How a pair stands to the gate: the part that keeps it outside, or both parts if inside."""
    if gate.inside:
        parts = []
        if gate.distance_limit is not None:
            parts.append(f"d² {gate.distance:.3g} of at most {gate.distance_limit:.4g}")
        if gate.overlap is not None and gate.overlap_floor > 0.0:
            parts.append(f"IoU {gate.overlap:.2f} of at least {gate.overlap_floor:g}")
        return "inside the gate: " + ", ".join(parts)
    parts = []
    if gate.distance_limit is not None and gate.distance > gate.distance_limit:
        radii = math.sqrt(gate.distance / gate.distance_limit)
        parts.append(
            f"d² is {gate.distance:.4g}, the limit {gate.distance_limit:.4g} "
            f"(P_G {gate.gate_probability:g}), {radii:.2g} times its radius; "
            + (
                f"P_G {probability_beyond(gate.tail_needed)} would have admitted it"
                if gate.tail_needed >= LEAST_TAIL
                else "no gate probability would have admitted it"
            )
        )
    if gate.overlap is not None and gate.overlap < gate.overlap_floor:
        parts.append(f"IoU is {gate.overlap:.3g}, the floor {gate.overlap_floor:g}")
    return "outside the gate: " + "; ".join(parts)
