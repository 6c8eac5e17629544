"""Measurement noise has the stated covariance: unbiased, right deviations, uncorrelated."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from tests.simulation.pairs import check_standard, filter_order, pairs, settings
from tracker.log.model import box_centre
from tracker.simulation import simulate

TAIL = 0.001


@pytest.mark.parametrize("scene", ["forecourt", "fog", "scale"])
def test_box_noise(scene):
    changes = ("drift.objects=100",) if scene == "scale" else ()
    sequence = simulate(scene, seed=5, settings=settings(scene, *changes))
    measured, true = filter_order(sequence)
    noise = sequence.settings.noise
    visibility = sequence.objects.visibility[pairs(sequence)[1]]
    scale = np.sqrt(true[:, 2] * true[:, 3]) * (1 + noise.occlusion_factor * (1 - visibility))
    sigma = scale[:, None] * np.repeat([noise.position_sigma, noise.size_sigma], 2)
    # Rounding to 0.01 px adds 0.003 px to sigmas above 1 px: nothing.
    check_standard((measured - true) / sigma)


def test_box_noise_is_correlated_over_time_if_asked():
    sequence = simulate(
        "scale",
        seed=2,
        settings=settings(
            "scale",
            "drift.objects=100",
            "drift.life_seconds=0",
            "detection.probability=1",
            "noise.correlation_seconds=0.2",
        ),
    )
    detection, true = pairs(sequence)
    order = np.argsort(true)
    error = (sequence.log().z[detection] - sequence.truth().z[true])[order]
    error = error.reshape(len(sequence.frames), 100, 4)
    for lag in (1, 5):
        now, later = error[:-lag].reshape(-1, 4), error[lag:].reshape(-1, 4)
        for k in range(4):
            found = np.corrcoef(now[:, k], later[:, k])[0, 1]
            # 10,000 pairs, of which one in 2 tau / dt = 10 is independent: deviation 0.03.
            assert found == pytest.approx(np.exp(-lag * 0.04 / 0.2), abs=0.1)


def test_lidar_noise():
    sequence = simulate(
        "yard", seed=4, settings=settings("yard", "lidar.heading_flip_probability=0.1")
    )
    detection, true = pairs(sequence)
    lidar = sequence.settings.lidar
    columns = ("x", "y", "length", "width", "heading")
    measured, exact = (
        np.column_stack([sequence.tables[f"{name}_oriented.csv"][key] for key in columns])
        for name in ("detections", "truth")
    )
    error = measured[detection] - exact[true]
    turn = np.arctan2(np.sin(error[:, 4]), np.cos(error[:, 4]))
    flipped = np.abs(turn) > np.pi / 2
    low, high = stats.binom.interval(1 - TAIL, len(turn), 0.1)
    assert low <= flipped.sum() <= high
    error[:, 4] = np.where(flipped, turn - np.sign(turn) * np.pi, turn)
    sigma = [lidar.position_sigma_m] * 2 + [lidar.size_sigma_m] * 2
    check_standard(error / np.array([*sigma, np.radians(lidar.heading_sigma_degrees)]))
    # The points are the centres of the oriented boxes.
    assert np.array_equal(sequence.log().z, measured[:, :2])


def test_radar_noise():
    sequence = simulate("harbour", seed=4)
    detection, true = pairs(sequence)
    radar, objects = sequence.settings.radar, sequence.objects
    polar = sequence.tables["detections_polar.csv"]
    measured = np.column_stack([polar[key] for key in ("range", "azimuth", "range_rate")])
    x, y = objects.xy[true].T
    reach = np.hypot(x, y)
    rate = (objects.xy[true] * objects.velocity[true]).sum(axis=1) / reach
    error = measured[detection] - np.column_stack((reach, np.arctan2(y, x), rate))
    sigma = [radar.range_sigma_m, np.radians(radar.azimuth_sigma_degrees), radar.range_rate_sigma]
    check_standard(error / sigma)


def test_converted_radar_measurements_are_consistent_with_their_covariance():
    sequence = simulate("harbour", seed=4)
    measured, true = filter_order(sequence)
    rows = pairs(sequence)[0]
    found = sequence.detections
    xx, yy = (found.sigma[rows] ** 2).T
    xy = found.extra["covariance_xy"][rows]
    error = measured - true
    squared = yy * error[:, 0] ** 2 - 2 * xy * error[:, 0] * error[:, 1] + xx * error[:, 1] ** 2
    total = np.sum(squared / (xx * yy - xy**2))
    low, high = stats.chi2.ppf([TAIL / 2, 1 - TAIL / 2], 2 * len(rows))
    assert low < total < high


def test_detections_are_never_inside_out():
    sequence = simulate(
        "forecourt", seed=1, settings=settings("forecourt", "noise.size_sigma=3", "clock.seconds=4")
    )
    assert sequence.detections.values[:, 2:].min() > 0.0
    assert box_centre(sequence.detections.values)[:, 2:].min() > 0.0
