"""The evidence of a link against scipy's normals."""

import numpy as np
import pytest

from tests.kernels.states import random_states
from tests.reference import link as twin
from tracker.kernels import link
from tracker.kernels.link import LINK_OK


@pytest.fixture(params=["compiled", "plain"])
def link_evidence(request):
    kernel = link.link_evidence
    kernel = kernel if request.param == "compiled" else getattr(kernel, "py_func", kernel)

    def call(mean, covariance, later, *starts):
        evidence, distance = np.empty(len(later)), np.empty(len(later))
        status = kernel(mean, covariance, later, *starts, evidence, distance)
        return status, evidence, distance

    return call


def starts(seed, d, shift=0.0):
    """What some later tracks say of their beginnings."""
    some = random_states(seed, 7, d)
    information = np.linalg.inv(some.covariance)
    information = 0.5 * (information + information.transpose(0, 2, 1))
    shifted = some.mean.copy()
    shifted[:, :d] = 0.0
    weighted = np.einsum("nij,nj->ni", information, shifted)
    spread = np.ascontiguousarray(some.covariance[:, :d, :d])
    return some.mean[:, :d] + shift, information, weighted, spread


@pytest.mark.parametrize("d", [1, 2, 4])
def test_evidence_equals_scipys(link_evidence, d):
    ends = random_states(40 + d, 30, d)
    later = np.arange(30) % 7
    given = starts(50 + d, d)
    status, evidence, distance = link_evidence(ends.mean, ends.covariance, later, *given)
    expected, squares = twin.link_evidence(ends.mean, ends.covariance, later, *given)
    assert status == LINK_OK
    np.testing.assert_allclose(evidence, expected, rtol=1e-7, atol=1e-7)
    np.testing.assert_allclose(distance, squares, rtol=1e-9)


def test_coordinates_far_from_the_origin_change_nothing(link_evidence):
    """Map coordinates: millions of metres, known to centimetres."""
    ends = random_states(60, 7, 2)
    later = np.arange(7)
    near = link_evidence(ends.mean, ends.covariance, later, *starts(61, 2))
    ends.mean[:, :2] += 5e6
    far = link_evidence(ends.mean, ends.covariance, later, *starts(61, 2, 5e6))
    # 5e6 has its last bit at 1e-9, and d² here reaches 1e4.
    np.testing.assert_allclose(far[1], near[1], rtol=1e-6)


def test_a_beginning_that_says_nothing_of_the_rates(link_evidence):
    """J is singular there: a track of one detection."""
    ends = random_states(62, 3, 2)
    origin, information, weighted, spread = starts(63, 2)
    information[:, 2:, :] = information[:, :, 2:] = 0.0
    information[:, :2, :2] = np.linalg.inv(spread)
    weighted[:] = 0.0
    status, evidence, distance = link_evidence(
        ends.mean, ends.covariance, np.arange(3), origin, information, weighted, spread
    )
    assert status == LINK_OK
    total = ends.covariance[:, :2, :2] + spread[:3]
    expected = -0.5 * (distance + np.linalg.slogdet(total)[1] - np.linalg.slogdet(spread[:3])[1])
    np.testing.assert_allclose(evidence, expected, rtol=1e-9)


def test_a_state_that_is_no_covariance_is_named(link_evidence):
    ends = random_states(64, 5, 2)
    ends.covariance[2, 0, 0] = -1e9
    status, _, _ = link_evidence(ends.mean, ends.covariance, np.zeros(5, int), *starts(65, 2))
    assert status == 2
