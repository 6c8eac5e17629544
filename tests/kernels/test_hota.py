"""HOTA's counts against the paper's formulas in plain loops."""

from __future__ import annotations

import numpy as np
import pytest

from tests.kernels.scenes import random_scene
from tests.reference import hota as reference
from tracker.kernels.hota import hota_by_frame, hota_counts

THRESHOLDS = np.array([0.05, 0.3, 0.5, 0.8])


@pytest.mark.parametrize("seed", range(25))
def test_against_the_formulas(seed):
    scene = random_scene(seed, frames=5, largest=3)
    thing = np.repeat(scene.truth, np.diff(scene.pair_start))
    key, couple = np.unique(10 * thing + scene.track[scene.pair_row], return_inverse=True)
    object_rows = np.bincount(scene.truth, minlength=10)[key // 10]
    track_rows = np.bincount(scene.track, minlength=10)[key % 10]
    given = (scene, couple.astype(np.int64), len(key), object_rows, track_rows, THRESHOLDS)
    for found, wanted in zip(hota_counts(*given), reference.hota_counts(*given), strict=True):
        np.testing.assert_allclose(found, wanted, rtol=1e-12, atol=1e-12)
    by_frame = hota_by_frame(*given)
    for found, wanted in zip(by_frame, reference.hota_by_frame(*given), strict=True):
        np.testing.assert_allclose(found, wanted, rtol=1e-12, atol=1e-12)
    for found, whole in zip(by_frame, hota_counts(*given), strict=True):
        np.testing.assert_allclose(found.sum(axis=0), whole, rtol=1e-12, atol=1e-12)
