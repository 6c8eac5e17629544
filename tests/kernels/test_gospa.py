"""The best pairs of GOSPA and OSPA, against trying them all."""

from __future__ import annotations

import numpy as np
import pytest

from tests.kernels.scenes import random_scene
from tests.reference import gospa as reference
from tracker.kernels.gospa import set_pairs


@pytest.mark.parametrize("seed", range(25))
def test_against_all_pairings(seed):
    scene = random_scene(seed, frames=5, largest=3)
    pairs, square = set_pairs(scene, 1.0)
    wanted_pairs, wanted_square = reference.set_pairs(scene, 1.0)
    assert pairs.tolist() == wanted_pairs
    np.testing.assert_allclose(square, wanted_square, atol=1e-12)
