"""Random numbers by name, and correlated ones."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from tracker.errors import UsageError
from tracker.simulation.streams import Streams, correlated_normals, happens, poisson_times


def test_same_name_same_numbers_and_another_name_others():
    streams = Streams(5)
    first = streams("clutter").random(100)
    streams("noise").random(7)  # what others draw does not matter
    assert np.array_equal(first, streams("clutter").random(100))
    assert not np.array_equal(first, streams("noise").random(100))
    assert not np.array_equal(first, Streams(6)("clutter").random(100))


def test_streams_of_different_names_are_uncorrelated():
    # Under independence r is normal with deviation 1 / sqrt(n); 4 deviations, seeded.
    a, b = (
        Streams(5)("clutter").standard_normal(40_000),
        Streams(5)("noise").standard_normal(40_000),
    )
    assert abs(np.corrcoef(a, b)[0, 1]) < 4 / np.sqrt(40_000)


def test_a_negative_seed_is_refused():
    with pytest.raises(UsageError, match="a seed is 0 or greater, found -1"):
        Streams(-1)


def _owners_in_time(owners: int, frames: int) -> tuple[np.ndarray, np.ndarray]:
    return np.tile(np.arange(owners), frames), np.repeat(0.1 * np.arange(frames), owners)


def test_correlated_normals_are_standard_normal_with_the_stated_correlation():
    owner, time = _owners_in_time(4000, 12)
    values = correlated_normals(np.random.default_rng(1), owner, time, 0.3, 2)
    by_owner = values[np.argsort(owner, kind="stable")].reshape(4000, 12, 2)
    for k in (0, 5, 11):  # stationary: the same at the beginning and later
        # Kolmogorov-Smirnov at 0.1%, seeded.
        assert stats.kstest(by_owner[:, k, 0], "norm").pvalue > 0.001
    for lag in (1, 3, 6):
        expected = np.exp(-0.1 * lag / 0.3)
        found = np.mean(by_owner[:, 0, :] * by_owner[:, lag, :])
        # Deviation of the mean of a product of two standard normals: sqrt((1 + r²) / n).
        assert abs(found - expected) < 4 * np.sqrt((1 + expected**2) / 8000)


def test_correlated_normals_follow_the_recursion_row_by_row():
    owner = np.array([3, 1, 3, 1, 3, 2])
    time = np.array([0.0, 0.0, 0.2, 0.2, 0.9, 0.9])
    white = np.random.default_rng(4).standard_normal((6, 1))
    found = correlated_normals(np.random.default_rng(4), owner, time, 0.5, 1)
    last: dict[int, tuple[float, float]] = {}
    for k in range(6):
        expected = float(white[k, 0])
        if owner[k] in last:
            before, value = last[owner[k]]
            kept = np.exp(-(time[k] - before) / 0.5)
            expected = kept * value + np.sqrt(1 - kept**2) * expected
        last[owner[k]] = (time[k], expected)
        assert found[k, 0] == pytest.approx(expected, abs=1e-12)


def test_without_correlation_they_are_white_and_empty_is_fine():
    owner, time = _owners_in_time(3, 4)
    white = correlated_normals(np.random.default_rng(1), owner, time, 0.0, 1)
    assert np.array_equal(white, np.random.default_rng(1).standard_normal((12, 1)))
    assert correlated_normals(np.random.default_rng(1), owner[:0], time[:0], 1.0, 3).shape == (0, 3)


def test_things_happen_with_their_probability():
    rng = np.random.default_rng(8)
    for p in (0.0, 0.1, 0.9, 1.0):
        hits = happens(np.full(20_000, p), rng.standard_normal(20_000)).sum()
        low, high = stats.binom.interval(0.9999, 20_000, p) if 0 < p < 1 else (20_000 * p,) * 2
        assert low <= hits <= high


def test_poisson_times_have_the_rate_and_a_longer_time_only_adds():
    short = poisson_times(2.0, -5.0, 1000.0, np.random.default_rng(2))
    longer = poisson_times(2.0, -5.0, 1500.0, np.random.default_rng(2))
    assert np.array_equal(short, longer[: len(short)])
    low, high = stats.poisson.interval(0.9999, 2.0 * 1005.0)
    assert low <= len(short) <= high
    assert -5.0 <= short.min() <= short.max() < 1000.0
    assert len(poisson_times(1e-9, 0.0, 1.0, np.random.default_rng(2))) == 1
