"""Intervals of differences: small cases by hand, coverage, agreement with scipy."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.stats import bootstrap

from tracker.comparison.bootstrap import (
    Resampling,
    check_resampling,
    interval,
    resample,
    share_above,
    units_needed,
)
from tracker.comparison.parts import COLUMNS, COUNTS
from tracker.errors import UsageError
from tracker.log import Kind

BOXES = frozenset({Kind.BOX})


def parts(**columns):
    """(U, COLUMNS) of which only these counts are given."""
    out = np.zeros((len(next(iter(columns.values()))), COLUMNS))
    for name, values in columns.items():
        out[:, COUNTS.index(name)] = values
    return out


def plan(units, *, resamples=1000, seed=0):
    return Resampling("block", units, 1.0, resamples, 0.95, seed)


def test_counts_are_drawn_and_ratios_formed_afterwards():
    # Two units, so three outcomes: the first twice, one of each, the second twice.
    runs = (
        parts(truth_boxes=[10, 30], matches=[10, 0]),
        parts(truth_boxes=[10, 30], matches=[5, 15]),
    )
    a, b = resample(runs, ["recall", "matches"], BOXES, plan(2, resamples=4000))
    outcomes, number = np.unique(np.column_stack((a, b)), axis=0, return_counts=True)
    # The mean of ratios would give 0.5 for one of each.
    wanted = [[0.0, 0, 0.5, 30], [0.25, 10, 0.5, 20], [1.0, 20, 0.5, 10]]
    assert outcomes.tolist() == wanted
    # Binomial: 1/4, 1/2, 1/4 of 4000; five standard errors are 137, 158, 137.
    assert np.all(np.abs(number - [1000, 2000, 1000]) < [137, 158, 137])


def test_the_same_units_are_drawn_for_both_runs():
    rng = np.random.default_rng(1)
    counts = rng.integers(1, 50, 12)
    a, b = resample(
        (parts(switches=counts), parts(switches=counts + 3)), ["switches"], BOXES, plan(12)
    )
    assert np.all(b - a == 36)


def test_a_score_without_a_value_is_not_a_number():
    runs = (parts(truth_boxes=[0, 4], matches=[0, 2]),) * 2
    a, _ = resample(runs, ["recall"], BOXES, plan(2))
    assert set(np.unique(a[np.isfinite(a)])) == {0.5}
    assert 0.15 < np.isnan(a).mean() < 0.35  # both draws fall on the empty unit: 1/4


def test_the_seed_decides():
    runs = (parts(switches=range(9)), parts(switches=range(9, 0, -1)))
    first, again, other = (
        resample(runs, ["switches"], BOXES, plan(9, seed=seed)) for seed in (5, 5, 6)
    )
    np.testing.assert_array_equal(first, again)
    assert not np.array_equal(first, other)


@pytest.mark.parametrize("count", [100, 255, 256, 257, 700])
def test_every_resample_is_filled(count):
    runs = (parts(switches=[1, 1]), parts(switches=[2, 2]))
    a, b = resample(runs, ["switches"], BOXES, plan(2, resamples=count))
    assert a.shape == (count, 1)
    assert np.all(a == 2)
    assert np.all(b == 4)


def drawn_means(rng, values, resamples):
    units = len(values)
    return rng.multinomial(units, np.full(units, 1 / units), resamples) @ values / units


def test_interval_is_the_percentile_interval_where_units_are_many():
    # scipy's own percentile bootstrap of a mean. Both ends are quantiles of 20,000 resamples;
    # their standard error is √(0.025 · 0.975 / 20000) / density ≈ 0.0011 / 0.058 = 0.019 standard
    # deviations of the mean, and two of them are compared: five times √2 · 0.019 = 0.13.
    rng = np.random.default_rng(2)
    values = rng.exponential(1.0, 400)
    ours = interval(drawn_means(rng, values, 20_000), 0.95, len(values))
    theirs = bootstrap(
        (values,), np.mean, n_resamples=20_000, method="percentile", rng=rng
    ).confidence_interval
    spread = values.std() / 20
    assert np.all(np.abs(np.array(ours) - theirs) < 0.13 * spread)


@pytest.mark.parametrize(("units", "plain"), [(8, 0.90), (20, 0.94)])
def test_coverage(units, plain):
    """Intervals hold the true difference in 95% of cases, also where units are few.

    Units differ in size and in how much B gains; the true difference of the ratio is 0.1.
    Tolerance: four binomial standard errors of 2,000 cases, 4 √(0.95 · 0.05 / 2000) = 0.0195.
    """
    rng = np.random.default_rng(3)
    held = held_plain = 0
    cases = 2000
    for _ in range(cases):
        size = rng.integers(50, 150, units).astype(float)
        gain = size * rng.normal(0.1, 0.2, units)
        drawn = rng.multinomial(units, np.full(units, 1 / units), 999).astype(float)
        values = drawn @ gain / (drawn @ size)
        lower, upper = interval(values, 0.95, units)
        held += lower <= 0.1 <= upper
        lower, upper = np.quantile(values, (0.025, 0.975))
        held_plain += lower <= 0.1 <= upper
    assert abs(held / cases - 0.95) < 0.0195
    # What the expansion is for.
    assert held_plain / cases < plain


def test_more_confidence_is_wider():
    values = np.random.default_rng(4).normal(size=5000)
    widths = [np.diff(interval(values, confidence, 30))[0] for confidence in (0.5, 0.9, 0.99)]
    assert widths == sorted(widths)


def test_no_interval():
    values = np.arange(100.0)
    assert interval(values, 0.95, 1) is None
    assert interval(values, 0.95, 5) is None
    assert interval(values, 0.95, 6) is not None
    assert interval(np.full(100, np.nan), 0.95, 10) is None
    values[:51] = np.nan
    assert interval(values, 0.95, 10) is None
    values[50] = 50.0
    assert interval(values, 0.95, 10) is not None


@pytest.mark.parametrize(
    ("confidence", "needed"), [(0.5, 2), (0.75, 3), (0.9, 5), (0.95, 6), (0.99, 8)]
)
def test_units_needed(confidence, needed):
    # Two-sided sign test with all signs equal: p = 2 · 2^−n.
    assert units_needed(confidence) == needed
    assert 2 * 0.5**needed <= 1 - confidence + 1e-12 < 2 * 0.5 ** (needed - 1) + 1e-9


def test_share_above():
    assert share_above(np.array([1.0, 2.0, 0.0, -1.0, np.nan])) == (2 + 0.5) / 4
    assert share_above(np.zeros(7)) == 0.5
    assert share_above(np.array([np.nan])) is None


@pytest.mark.parametrize(
    ("numbers", "sentence"),
    [
        ((99, 0.95, None), "at least 100 resamples, not 99"),
        ((1000, 1.0, None), "below 1, not 1.0"),
        ((1000, 0.4, None), "at least 0.5"),
        ((1000, 0.95, 0.0), "longer than 0 seconds"),
        ((1000, 0.95, float("nan")), "longer than 0 seconds"),
        ((1000, float("nan"), None), "confidence"),
    ],
)
def test_numbers_that_make_no_sense(numbers, sentence):
    with pytest.raises(UsageError, match=sentence):
        check_resampling(*numbers)
