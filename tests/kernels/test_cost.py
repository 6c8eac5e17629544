"""Cost terms against scipy's densities."""

import math

import numpy as np
import pytest

from tests.reference import cost as twin
from tracker.kernels.cost import (
    appearance_term,
    blend_embeddings,
    label_term,
    likelihood_term,
    mahalanobis_term,
    overlap_term,
)


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
        z = rng.uniform(1.0, 50.0, (3, d))
        scaled = d == 4
        term = likelihood_term(
            np.array([((innovation / sigma) ** 2).sum()]),
            np.array([2.0 * np.log(sigma).sum()]),
            z,
            np.array([2]),
            scaled,
            math.log(density),
        )
        unit = math.sqrt(z[2, 2] * z[2, 3]) if scaled else 1.0
        expected = twin.likelihood_term(innovation / unit, sigma / unit, density)
        assert term[0] == pytest.approx(expected, rel=1e-12)


def test_label_term():
    track, detection = np.array([0, 1, -1, 2], np.int32), np.array([0, 2, 1, -1], np.int32)
    expected = twin.label_term(track, detection, 0.5, 3.0)
    assert label_term(track, detection, 0.5, 3.0).tolist() == expected == [-0.5, 3.0, 0.0, 0.0]


def embeddings(seed, count):
    vectors = np.random.default_rng(seed).normal(size=(count, 8)).astype(np.float32)
    vectors[0] = 0.0  # says nothing
    return vectors


def test_appearance_term():
    tracks, seen = embeddings(1, 5), embeddings(2, 6)
    row, column = np.array([0, 1, 2, 4, 3]), np.array([3, 0, 2, 5, 1])
    term = appearance_term(tracks, row, seen, column, 4.0, 0.5)
    expected = twin.appearance_term(tracks, row, seen, column, 4.0, 0.5)
    np.testing.assert_allclose(term, expected, rtol=1e-6, atol=1e-12)
    same = appearance_term(tracks, np.array([1]), 7.0 * tracks, np.array([1]), 4.0, 0.5)
    assert same[0] == pytest.approx(-2.0, rel=1e-6)


def test_blend_embeddings():
    tracks, seen = embeddings(3, 4), embeddings(4, 4)
    pairing = np.array([1, -1, 0, 3])
    expected = twin.blend_embeddings(tracks, pairing, seen, 0.9)
    blend_embeddings(tracks, pairing, seen, 0.9)
    np.testing.assert_allclose(tracks, expected, rtol=1e-5, atol=1e-6)
