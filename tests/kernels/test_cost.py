"""Cost terms against scipy's densities."""

import math

import numpy as np
import pytest

from tests.reference import cost as twin
from tracker.kernels.cost import likelihood_term, mahalanobis_term, overlap_term


def test_overlap_term():
    overlap = np.array([0.0, 0.25, 0.5, 1.0])
    expected = twin.overlap_term(overlap, 8.0, 0.5)
    assert overlap_term(overlap, 8.0, 0.5).tolist() == expected == [4.0, 2.0, 0.0, -4.0]


def test_mahalanobis_term_is_neutral_at_the_gate():
    distance = np.array([0.0, 4.0, 9.0])
    assert mahalanobis_term(distance, 9.0).tolist() == twin.mahalanobis_term(distance, 9.0)
    assert mahalanobis_term(np.array([9.0]), 9.0)[0] == 0.0


def test_likelihood_term_equals_scipys_density():
    rng = np.random.default_rng(1)
    for _ in range(20):
        d = int(rng.choice([2, 4]))
        sigma = rng.uniform(0.3, 4.0, d)
        innovation = rng.normal(0.0, 1.0, d) * sigma
        density = rng.uniform(1e-4, 1.0)
        term = likelihood_term(
            np.array([((innovation / sigma) ** 2).sum()]),
            np.array([2.0 * np.log(sigma).sum()]),
            d,
            math.log(density),
        )
        assert term[0] == pytest.approx(twin.likelihood_term(innovation, sigma, density), rel=1e-12)
