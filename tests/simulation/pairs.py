"""Shared by these tests: which object a detection came from, and a check of Gaussian noise."""

from __future__ import annotations

import numpy as np
from scipy import stats

from tracker.log.model import Floats, Ints
from tracker.simulation import CLUTTER, SCENES, SimulatedSequence
from tracker.simulation.overrides import scene_settings

TAIL = 0.001  # two-sided; everything is seeded, so that it cannot fail by chance later


def pairs(sequence: SimulatedSequence) -> tuple[Ints, Ints]:
    """Rows (detection, truth) of every detection that is not clutter."""
    found, true = sequence.detections, sequence.objects
    row = {
        key: k for k, key in enumerate(zip(true.frame.tolist(), true.object.tolist(), strict=True))
    }
    rows = np.flatnonzero(found.origin != CLUTTER)
    keys = zip(found.frame[rows].tolist(), found.origin[rows].tolist(), strict=True)
    return rows, np.array([row[key] for key in keys])


def settings(scene: str, *texts: str):
    """A scene's settings with changes like those of --set."""
    return scene_settings(SCENES[scene].settings, None, texts)


def filter_order(sequence: SimulatedSequence) -> tuple[Floats, Floats]:
    """Measured and true values of all paired detections, boxes as centre and size."""
    detection, true = pairs(sequence)
    return sequence.log().z[detection], sequence.truth().z[true]


def check_standard(normals: np.ndarray) -> None:
    """(n, d) should be independent standard normal numbers (seeded, bounds at 0.1%)."""
    count, dimension = normals.shape
    # n times the sample mean squared is chi-square with d degrees.
    assert count * np.sum(normals.mean(axis=0) ** 2) < stats.chi2.ppf(1 - TAIL, dimension)
    for column in normals.T:
        low, high = stats.chi2.ppf([TAIL / 2, 1 - TAIL / 2], count)
        assert low < np.sum(column**2) < high
    correlation = np.corrcoef(normals.T) - np.eye(dimension)
    assert np.abs(correlation).max() < 4 / np.sqrt(count)
