"""Converted radar measurements are unbiased and their covariance is right.

The check of the paper itself (Lerro and Bar-Shalom 1993, from memory): over many measurements of
a fixed target the mean error is zero and the normalised error squared averages to 2.
"""

from __future__ import annotations

import numpy as np
import pytest

from tracker.simulation.sensors.conversion import debiased

RUNS = 40_000


@pytest.mark.parametrize("degrees", [0.35, 2.0, 8.0])
@pytest.mark.parametrize("azimuth", [-1.0, 0.0, 0.7, np.pi / 2])
def test_converted_measurements_are_consistent(degrees, azimuth):
    rng = np.random.default_rng(3)
    reach, sigma_range, sigma = 3000.0, 20.0, np.radians(degrees)
    measured_range = reach + sigma_range * rng.standard_normal(RUNS)
    measured_azimuth = azimuth + sigma * rng.standard_normal(RUNS)
    xy, covariance = debiased(measured_range, measured_azimuth, sigma_range, sigma)
    error = xy - reach * np.array([np.cos(azimuth), np.sin(azimuth)])
    # Mean error within 4 standard errors of zero on both axes. The average bias is taken at the
    # measured place, which leaves a second-order remainder: r s^4 / 2.
    standard = error.std(axis=0) / np.sqrt(RUNS)
    assert np.all(np.abs(error.mean(axis=0)) < 4 * standard + reach * sigma**4)
    xx, yy, covar = covariance.T
    determinant = xx * yy - covar**2
    squared = yy * error[:, 0] ** 2 - 2 * covar * error[:, 0] * error[:, 1] + xx * error[:, 1] ** 2
    nees = (squared / determinant).mean()
    # Chi-square of 2 degrees over RUNS: deviation 2 / sqrt(RUNS) = 0.01. The errors lie on an arc,
    # not in an ellipse: the paper claims consistency to 10 degrees, we allow 5%.
    assert nees == pytest.approx(2.0, rel=0.05)


def test_the_plain_conversion_would_be_biased():
    """At 8 degrees the plain conversion is short by r (1 - exp(-s²/2)) = 29 m of 3000 m."""
    rng = np.random.default_rng(3)
    azimuth = np.radians(8.0) * rng.standard_normal(RUNS)
    plain = 3000.0 * np.cos(azimuth).mean()
    xy, _ = debiased(np.full(RUNS, 3000.0), azimuth, 1e-9, np.radians(8.0))
    assert 3000.0 - plain > 25.0
    assert abs(xy[:, 0].mean() - 3000.0) < 1.5


def test_small_angles_give_the_textbook_linear_covariance():
    """First order: along the beam sigma_range², across it (range sigma_azimuth)²."""
    _, covariance = debiased(np.array([1000.0]), np.array([0.0]), 5.0, 0.001)
    assert covariance[0] == pytest.approx([25.0, 1.0, 0.0], rel=1e-3, abs=1e-6)
    _, turned = debiased(np.array([1000.0]), np.array([np.pi / 4]), 5.0, 0.001)
    assert turned[0] == pytest.approx([13.0, 13.0, 12.0], rel=1e-3)
