"""How much worse B may be: `idf1=0.005`, and whether it is."""

from __future__ import annotations

import difflib
import re
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from tracker.comparison.model import COMPARED, LOWER_BETTER, Change
from tracker.errors import UsageError
from tracker.evaluation.scores import RATIOS

_FORM = re.compile(r"\s*([A-Za-z_0-9]+)\s*=\s*([-+.0-9eE]+)\s*(%?)\s*")


@dataclass(frozen=True, slots=True)
class Tolerance:
    """The largest amount by which B's overall score may be worse than A's."""

    score: str
    amount: float


@dataclass(frozen=True, slots=True)
class Judgement:
    """Whether a tolerance was met.

    worse_by : by how much B is worse (negative: better), the worse end of the interval if
    `by_interval`; None where there is no such number, which fails.
    """

    tolerance: Tolerance
    worse_by: float | None
    by_interval: bool

    @property
    def met(self) -> bool:
        # Rounding must not fail what is equal: ratios are sums of a few thousand roundings.
        return self.worse_by is not None and self.worse_by <= self.tolerance.amount + 1e-12

    @property
    def where(self) -> str:
        return "overall"

    @property
    def name(self) -> str:
        end = ", by the interval" if self.by_interval else ""
        return f"{self.tolerance.score} no worse by more than {self.tolerance.amount:g}{end}"

    @property
    def found(self) -> str:
        """What was found, in words."""
        if self.worse_by is None:
            return "no value"
        if self.worse_by == 0.0:
            return "the same"
        return f"{'worse' if self.worse_by > 0 else 'better'} by {abs(self.worse_by):.6g}"

    @property
    def message(self) -> str:
        """What a report of failures says."""
        limit = f"at most {self.tolerance.amount:g} worse is allowed"
        return f"{self.tolerance.score}: {self.found}, {limit}"

    def as_dict(self) -> dict[str, Any]:
        return {
            "score": self.tolerance.score,
            "tolerance": self.tolerance.amount,
            "by_interval": self.by_interval,
            "worse_by": self.worse_by,
            "met": self.met,
        }


def parse_tolerance(text: str) -> Tolerance:
    """A tolerance from words like ``idf1=0.005``, ``idf1=0.5%`` or ``switches=3``.

    Raises UsageError, with the likely name where the score is unknown.
    """
    match = _FORM.fullmatch(text)
    try:
        if match is None:
            raise ValueError
        score, number, percent = match.groups()
        amount = float(number)
    except ValueError:
        raise UsageError(
            f"--no-worse-than reads like 'idf1=0.005' or 'switches=3' (found {text!r})"
        ) from None
    if score not in COMPARED:
        near = difflib.get_close_matches(score.lower(), COMPARED, n=1, cutoff=0.5)
        hint = f"; did you mean '{near[0]}'?" if near else ""
        raise UsageError(
            f"--no-worse-than: '{score}' is no score that can be better or worse{hint} "
            f"({', '.join(COMPARED)})"
        )
    if percent:
        if score not in RATIOS or score == "motp":
            raise UsageError(f"--no-worse-than: {score} is no ratio, so it has no percent")
        amount /= 100.0
    if amount < 0.0:
        raise UsageError(f"--no-worse-than: a tolerance is at least 0 (found {text!r})")
    if score in RATIOS and score != "motp" and amount >= 1.0:
        raise UsageError(
            f"--no-worse-than: {score} is a ratio of at most 1 (found {text!r}); write 0.005 or "
            "0.5%"
        )
    return Tolerance(score, amount)


def judge(
    changes: dict[str, Change], tolerances: Sequence[Tolerance], *, by_interval: bool
) -> list[Judgement]:
    """Hold the overall changes to the tolerances, in the order given.

    by_interval : whether the worse end of the interval decides, not the difference itself: then
    B passes only if the data rule out, at that confidence, that it is worse by more.
    """
    out = []
    for tolerance in tolerances:
        change = changes[tolerance.score]
        lower_better = tolerance.score in LOWER_BETTER
        value = change.difference
        if by_interval:
            value = change.upper if lower_better else change.lower
        worse = None if value is None else value if lower_better else 0.0 - value
        out.append(Judgement(tolerance, worse, by_interval))
    return out
