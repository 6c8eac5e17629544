"""How sure a difference is: a paired bootstrap over sequences or blocks of time.

Units are drawn with replacement, the same for both runs, their *counts* are added and the scores
formed of the sums, as overall scores are. The interval is the percentile interval (Efron and
Tibshirani 1993, ch. 13), expanded for few units: with n units the share outside each end is
Φ(−√(n/(n−1)) t), t being the quantile of Student's distribution with n − 1 degrees of freedom
(Hesterberg 2015, "What teachers should know about the bootstrap"; form from memory). Without that,
95% intervals of 8 units hold the truth in 88% of cases, and so do BCa intervals.

Below some number of units there is no interval: if both runs were equally good, n units would all
favour the same one with probability 2^(1−n) (sign test), and resampling would call that certain.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from scipy.stats import norm
from scipy.stats import t as student

from tracker.comparison.parts import scores_of
from tracker.errors import UsageError
from tracker.log.model import Floats, Kind

CHUNK = 256  # resamples drawn at a time


@dataclass(frozen=True, slots=True)
class Resampling:
    """What was drawn: `units` of `unit` ('sequence' or 'block'), `resamples` times from `seed`.

    block_seconds : length of a block, None for sequences.   confidence : of the intervals.
    """

    unit: str
    units: int
    block_seconds: float | None
    resamples: int
    confidence: float
    seed: int


def check_resampling(resamples: int, confidence: float, block_seconds: float | None) -> None:
    """Raise UsageError for numbers that make no sense."""
    if resamples < 100:
        raise UsageError(f"an interval needs at least 100 resamples, not {resamples}")
    if not 0.5 <= confidence < 1.0:
        raise UsageError(f"the confidence is at least 0.5 and below 1, not {confidence}")
    if block_seconds is not None and not 0.0 < block_seconds < np.inf:
        raise UsageError(f"a block is longer than 0 seconds, not {block_seconds}")


def units_needed(confidence: float) -> int:
    """The fewest units that can show a difference: 2^(1−n) ≤ 1 − confidence."""
    return math.ceil(1.0 - math.log2(1.0 - confidence) - 1e-9)


def resample(
    runs: tuple[Floats, Floats], names: Sequence[str], kinds: frozenset[Kind], plan: Resampling
) -> tuple[Floats, Floats]:
    """Scores of both runs in every resample.

    runs : (U, COLUMNS) of each.   names : of N scores.

    Returns (R, N) of each, not-a-number where a score has no value.
    """
    rng = np.random.default_rng(plan.seed)
    out = [np.empty((plan.resamples, len(names))) for _ in runs]
    equal = np.full(plan.units, 1.0 / max(plan.units, 1))
    for start in range(0, plan.resamples, CHUNK):
        stop = min(start + CHUNK, plan.resamples)
        drawn = rng.multinomial(plan.units, equal, stop - start).astype(np.float64)
        for values, parts in zip(out, runs, strict=True):
            # einsum adds in a fixed order; a matrix product may not, on another machine.
            for k, total in enumerate(np.einsum("ru,uc->rc", drawn, parts), start):
                scores = scores_of(total, kinds)
                values[k] = [np.nan if (v := scores.value(n)) is None else v for n in names]
    return out[0], out[1]


def interval(values: Floats, confidence: float, units: int) -> tuple[float, float] | None:
    """Expanded percentile interval of (R,) resampled values; None where there is none.

    Resamples without a value are left out, up to half of them.
    """
    known = values[np.isfinite(values)]
    if units < units_needed(confidence) or 2 * len(known) < len(values):
        return None
    tail = norm.cdf(np.sqrt(units / (units - 1)) * student.ppf((1.0 - confidence) / 2, units - 1))
    lower, upper = np.quantile(known, (tail, 1.0 - tail))
    return float(lower), float(upper)


def share_above(values: Floats) -> float | None:
    """Share of (R,) resampled values above 0, those at 0 counting half; None without any."""
    known = values[np.isfinite(values)]
    if not len(known):
        return None
    return float(np.mean(known > 0.0) + 0.5 * np.mean(known == 0.0))
