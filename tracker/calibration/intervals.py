"""Confidence intervals of shares and rates."""

from __future__ import annotations

import math

from scipy.stats import chi2, norm

LEVEL = 0.95


def share_interval(successes: int, trials: int, level: float = LEVEL) -> tuple[float, float]:
    """Wilson's score interval of a binomial probability (Wilson 1927); (0, 1) without trials."""
    if trials == 0:
        return 0.0, 1.0
    q = float(norm.ppf(0.5 + 0.5 * level))
    p = successes / trials
    centre = (p + q * q / (2 * trials)) / (1.0 + q * q / trials)
    half = q * math.sqrt(p * (1.0 - p) / trials + q * q / (4.0 * trials * trials))
    half /= 1.0 + q * q / trials
    return max(0.0, centre - half), min(1.0, centre + half)


def count_interval(count: int, level: float = LEVEL) -> tuple[float, float]:
    """Exact interval of a Poisson mean after `count` events (Garwood 1936)."""
    tail = 0.5 * (1.0 - level)
    low = 0.5 * float(chi2.ppf(tail, 2 * count)) if count else 0.0
    return low, 0.5 * float(chi2.ppf(1.0 - tail, 2 * count + 2))


def sigma_interval(sigma: float, freedom: float, level: float = LEVEL) -> tuple[float, float]:
    """Interval of a normal standard deviation estimated with `freedom` degrees of freedom."""
    tail = 0.5 * (1.0 - level)
    return (
        sigma * math.sqrt(freedom / float(chi2.ppf(1.0 - tail, freedom))),
        sigma * math.sqrt(freedom / float(chi2.ppf(tail, freedom))),
    )
