"""On motion that matches its model, the filter's errors are as large as it says they are."""

import numpy as np
import pytest
from scipy.stats import chi2, kstest

from tests.reference import kalman as twin
from tracker.kernels.kalman import (
    initiate_constant_velocity,
    predict_constant_velocity,
    squared_mahalanobis,
    update_constant_velocity,
)

RUNS = 50  # averaged in one consistency test


def simulated(seed, objects, d, steps):
    """Filter objects that move as the model says, at irregular times, some frames unseen.

    Returns the normalised estimation error squared (steps, objects) after each step, and d² of
    the measurements (steps, objects), nan where there was none.
    """
    rng = np.random.default_rng(seed)
    density = np.full((objects, d), 0.8)
    variance = np.full((objects, d), 0.25)
    rate_variance = np.full((objects, d), 4.0)
    truth = rng.normal(0.0, 1.0, (objects, 2 * d)) * [*[50.0] * d, *[2.0] * d]
    z = truth[:, :d] + rng.normal(0.0, 0.5, (objects, d))
    mean, covariance = np.empty((objects, 2 * d)), np.empty((objects, 2 * d, 2 * d))
    initiate_constant_velocity(z, variance, rate_variance, mean, covariance)
    scratch = np.empty((d + 2, d))
    errors, distances = np.empty((steps, objects)), np.full((steps, objects), np.nan)
    for k in range(steps):
        step = rng.choice([0.1, 0.2, 1.0]) * rng.uniform(0.5, 1.5)
        root = np.linalg.cholesky(twin.process_noise(density[0], step))
        truth = truth @ twin.transition(d, step).T + rng.normal(size=truth.shape) @ root.T
        predict_constant_velocity(mean, covariance, step, density, False)
        seen = np.where(rng.random(objects) < 0.8, np.arange(objects), -1)
        z = truth[:, :d] + rng.normal(0.0, 0.5, (objects, d))
        for i in np.flatnonzero(seen >= 0):
            distances[k, i] = squared_mahalanobis(
                mean, covariance, i, z, variance, i, scratch, False
            )[0]
        update_constant_velocity(mean, covariance, seen, z, variance, False)
        error = (truth - mean)[:, :, None]
        errors[k] = (error * np.linalg.solve(covariance, error)).sum(axis=(1, 2))
    return errors, distances


def test_average_error_of_fifty_runs_is_within_its_published_interval():
    # Two states, 50 runs, two-sided 95%: [1.5, 2.6] in Bar-Shalom, Li and Kirubarajan 2001 (from
    # memory); chi2.ppf([0.025, 0.975], 100) / 50 = [1.48444, 2.59122].
    low, high = chi2.ppf([0.025, 0.975], 2 * RUNS) / RUNS
    assert (low, high) == pytest.approx((1.48444, 2.59122), abs=5e-6)
    groups = 200
    errors, _ = simulated(1, RUNS * groups, 1, 12)
    averages = errors[-1].reshape(groups, RUNS).mean(axis=1)
    inside = np.mean((averages >= low) & (averages <= high))
    # 95% of the groups, give or take four standard deviations of a binomial share of 200.
    assert abs(inside - 0.95) < 4 * np.sqrt(0.95 * 0.05 / groups)


@pytest.mark.parametrize("d", [1, 2, 4])
def test_errors_and_innovations_are_chi_square(d):
    errors, distances = simulated(10 + d, 1500, d, 10)
    # Level 1e-3, seeded; process noise twice or half as large gives errors below 1e-20.
    assert kstest(errors[-1], chi2(2 * d).cdf).pvalue > 1e-3
    distances = distances[np.isfinite(distances)]  # innovations are independent over time
    assert kstest(distances, chi2(d).cdf).pvalue > 1e-3


# NIST/SEMATECH e-Handbook 1.3.6.7.4: upper 0.95 and 0.99 points for 1 to 4 degrees of freedom.
@pytest.mark.parametrize(
    ("d", "points"),
    [(1, (3.841, 6.635)), (2, (5.991, 9.210)), (3, (7.815, 11.345)), (4, (9.488, 13.277))],
)
def test_published_gates_admit_their_share_of_innovations(d, points):
    _, distances = simulated(20 + d, 1500, d, 10)
    distances = distances[np.isfinite(distances)]
    for share, point in zip((0.95, 0.99), points, strict=True):
        assert chi2.ppf(share, d) == pytest.approx(point, abs=5e-4)
        tolerance = 4 * np.sqrt(share * (1 - share) / len(distances))  # binomial, four sigma
        assert abs(np.mean(distances <= point) - share) < tolerance


# E[d² | d² ≤ γ] = m F_{m+2}(γ) / F_m(γ) at a gate probability of 0.99 (recomputed).
@pytest.mark.parametrize(
    ("m", "expected"), [(1, 0.92476), (2, 1.90697), (3, 2.89408), (4, 3.88345)]
)
def test_gated_innovations_are_smaller_by_the_known_factor(m, expected):
    gate = chi2.ppf(0.99, m)
    assert m * chi2.cdf(gate, m + 2) / chi2.cdf(gate, m) == pytest.approx(expected, abs=5e-6)
    _, distances = simulated(30 + m, 3000, m, 10)
    accepted = distances[distances <= gate]
    standard_error = accepted.std() / np.sqrt(len(accepted))
    assert abs(accepted.mean() - expected) < 4 * standard_error
    assert abs(accepted.mean() - m) > 4 * standard_error  # the truncation is seen, not drowned
