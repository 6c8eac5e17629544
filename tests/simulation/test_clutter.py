"""Clutter is Poisson in number and uniform (or at its hot spots) in place."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from tests.simulation.pairs import settings
from tracker.simulation import CLUTTER, simulate
from tracker.simulation.sensors.clutter import ClutterSettings, clutter_boxes, clutter_frames
from tracker.simulation.streams import Streams

TAIL = 0.001  # two-sided; seeded, so that it cannot fail by chance later

RATES = {
    "forecourt": ("clutter.per_frame=3.5", 3.5),
    "fog": ("clutter.per_frame=10", 10.0),
    "yard": ("lidar.clutter_per_frame=2", 2.0),
    "harbour": ("radar.clutter_per_scan=8", 8.0),
    "scale": ("drift.objects=40", 2.0),
}


@pytest.mark.parametrize("scene", list(RATES))
def test_the_number_a_frame_is_poisson(scene):
    change, rate = RATES[scene]
    sequence = simulate(scene, seed=6, settings=settings(scene, change))
    found = sequence.detections
    counts = np.bincount(found.frame[found.origin == CLUTTER], minlength=len(sequence.frames))
    frames = len(counts)
    low, high = stats.poisson.interval(1 - TAIL, rate * frames)
    assert low <= counts.sum() <= high
    # Fisher's index of dispersion: sum (n - mean)² / mean is chi-square with frames - 1 degrees.
    index = np.sum((counts - counts.mean()) ** 2) / counts.mean()
    assert stats.chi2.ppf(TAIL / 2, frames - 1) < index < stats.chi2.ppf(1 - TAIL / 2, frames - 1)
    # Independent from frame to frame: r has deviation 1 / sqrt(frames).
    assert abs(np.corrcoef(counts[1:], counts[:-1])[0, 1]) < 4 / np.sqrt(frames)


def test_counts_follow_the_poisson_law_bin_by_bin():
    counts = np.bincount(clutter_frames(1.3, 6000, Streams(2)), minlength=6000)
    observed = np.array([*(np.sum(counts == k) for k in range(5)), np.sum(counts >= 5)])
    law = stats.poisson(1.3)
    expected = 6000 * np.array([*(law.pmf(k) for k in range(5)), law.sf(4)])
    assert stats.chisquare(observed, expected).pvalue > TAIL


def test_places_are_uniform_and_sizes_log_normal():
    chosen = ClutterSettings(
        height_median_px=60.0, height_spread=0.4, aspect=0.5, aspect_spread=0.2
    )
    boxes = clutter_boxes(chosen, 4000, 1280.0, 720.0, Streams(3))
    centre = boxes[:, :2] + 0.5 * boxes[:, 2:]
    for axis, size in ((0, 1280.0), (1, 720.0)):
        assert stats.kstest(centre[:, axis] / size, "uniform").pvalue > TAIL
    height, aspect = np.log(boxes[:, 3] / 60.0), np.log(boxes[:, 2] / boxes[:, 3] / 0.5)
    assert stats.kstest(height, "norm", args=(0.0, 0.4)).pvalue > TAIL
    assert stats.kstest(aspect, "norm", args=(0.0, 0.2)).pvalue > TAIL
    assert abs(stats.pearsonr(height, aspect)[0]) < 4 / np.sqrt(4000)


def test_hot_spots_take_their_share():
    chosen = ClutterSettings(hotspots=3, hotspot_share=0.4, hotspot_sigma_px=5.0)
    boxes = clutter_boxes(chosen, 5000, 1280.0, 720.0, Streams(3))
    centre = boxes[:, :2] + 0.5 * boxes[:, 2:]
    spots = Streams(3)("clutter hot spots").random((3, 2)) * [1280.0, 720.0]
    near = np.min(np.hypot(*(centre[:, None] - spots[None]).transpose(2, 0, 1)), axis=1) < 25.0
    # All of the 40% (25 px is 5 deviations) and of the others three discs' area of the image.
    expected = 0.4 + 0.6 * 3 * np.pi * 25.0**2 / (1280 * 720)
    low, high = stats.binom.interval(1 - TAIL, 5000, expected)
    assert low <= near.sum() <= high
