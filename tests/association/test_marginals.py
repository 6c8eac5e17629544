"""The public marginals, and how tiers are put together."""

import numpy as np
import pytest

from tests.kernels.problems import full, random_problems, sparse
from tests.reference import marginals as twin
from tracker import Engine, Frame
from tracker.association.marginals import marginals, mixture, tier_marginals
from tracker.errors import UsageError
from tracker.settings import settings_from


def test_equal_to_the_twin():
    for problem in random_problems(200, seed=91, largest=5):
        found = marginals(sparse(*problem))
        pair, miss, new = twin.marginals(*problem)
        np.testing.assert_allclose(found.pair, pair[problem[0]], atol=1e-9)
        np.testing.assert_allclose(found.miss, miss, atol=1e-9)
        np.testing.assert_allclose(found.new, new, atol=1e-9)


def test_two_tracks_two_detections_by_hand():
    """Gains of pairs over miss and new are odds: 4, 1 | 1, 4. Seven events: none 1; one pair
    4 + 1 + 1 + 4; both pairs 4 · 4 and 1 · 1. All 28; with pair (0, 0): 4 + 16 = 20."""
    cost = -np.log([[4.0, 1.0], [1.0, 4.0]])
    found = marginals(sparse(*full(cost, 0.0, 0.0)))
    np.testing.assert_allclose(found.pair, np.array([20, 2, 2, 20]) / 28, rtol=1e-12)
    np.testing.assert_allclose(found.miss, 6 / 28, rtol=1e-12)
    np.testing.assert_allclose(found.new, 6 / 28, rtol=1e-12)
    assert found.left_out.tolist() == [0.0]


@pytest.mark.parametrize(
    ("name", "value"), [("exact_limit", 0), ("exact_limit", 19), ("ranked", 0)]
)
def test_limits_have_ranges(name, value):
    with pytest.raises(UsageError, match=name):
        marginals(sparse(*full([[0.0]], 0.0, 0.0)), **{name: value})


TIERS = {
    "association": {"mode": "joint-probabilistic"},
    "cost": {"terms": ["likelihood"], "new_density": 0.05},
    "measurement": {"position_sigma": 0.5},
    "tiers": [
        {"name": "confident", "score_from": 0.5},
        {"name": "weak", "score_below": 0.5},
    ],
}


def test_a_later_tier_divides_what_the_earlier_left_to_the_miss():
    """The track is missed by the best assignment of the first tier, where a detection in its gate
    is improbable; a weak detection close by has its share of what is left."""
    engine = Engine(settings_from(TIERS), "point")
    engine.step(Frame.of_points(1, 0.0, [[0.0, 0.0]], [0.9]))
    result = engine.step(Frame.of_points(2, 0.1, [[2.3, 0.0], [0.1, 0.0]], [0.9, 0.2]))
    first, second = result.tiers
    assert first.solution.answer.row_column.tolist() == [-1]
    shares = [tier_marginals(tier, 14, 100) for tier in result.tiers]
    assert len(shares[0].pair) == len(shares[1].pair) == 1
    found = mixture((first, second), shares, 1)
    assert found.start.tolist() == [0, 2]
    assert found.detection.tolist() == [0, 1]
    near = shares[0].miss[0] * shares[1].pair[0]
    np.testing.assert_allclose(found.weight, [shares[0].pair[0], near], rtol=1e-15)
    for share, own in zip(result.marginals, shares, strict=True):
        assert (share.pair == own.pair).all()


def test_tracks_that_no_tier_saw_have_no_alternatives():
    settings = TIERS | {"tiers": [{"name": "confirmed only", "states": ["confirmed"]}]}
    engine = Engine(settings_from(settings), "point")
    engine.step(Frame.of_points(1, 0.0, [[0.0, 0.0], [9.0, 9.0]]))
    result = engine.step(Frame.of_points(2, 0.1, [[0.0, 0.0]]))
    found = mixture(result.tiers, result.marginals, 2)
    assert found.start.tolist() == [0, 0, 0]
    assert len(found.weight) == 0
