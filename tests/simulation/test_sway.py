"""The moving mast."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from tracker.simulation.sensors.projection import CameraSettings
from tracker.simulation.sensors.sway import SwaySettings, camera_pose
from tracker.simulation.streams import Streams

SWAY = SwaySettings(
    pan_sigma_degrees=1.0, tilt_sigma_degrees=0.5, roll_sigma_degrees=0.25, zoom_sigma=0.01
)


def test_angles_have_the_stated_deviation():
    """Over many seeds, at one time: Gaussian by the central limit theorem (24 harmonics)."""
    camera = CameraSettings(tilt_degrees=20.0)
    poses = [camera_pose(camera, SWAY, np.array([7.0]), Streams(seed)) for seed in range(800)]
    for name, mean, sigma in (("pan", 0, 1.0), ("tilt", 20, 0.5), ("roll", 0, 0.25)):
        values = np.degrees([getattr(pose, name)[0] for pose in poses])
        assert stats.kstest(values, "norm", args=(mean, sigma)).pvalue > 0.001
    zoom = np.array([pose.zoom[0] for pose in poses])
    assert stats.kstest(zoom, "norm", args=(1.0, 0.01)).pvalue > 0.001


def test_the_motion_is_in_the_stated_band():
    times = np.arange(0.0, 400.0, 0.08)
    pan = camera_pose(CameraSettings(), SWAY, times, Streams(1)).pan
    power = np.abs(np.fft.rfft(pan * np.hanning(len(pan)))) ** 2
    frequency = np.fft.rfftfreq(len(pan), 0.08)
    centre = np.sum(frequency * power) / np.sum(power)
    # 24 frequencies of deviation 0.15 Hz with equal power: the mean is known to 0.03 Hz.
    assert centre == pytest.approx(0.45, abs=0.1)


def test_a_still_mast_does_not_move_at_all():
    pose = camera_pose(CameraSettings(), SwaySettings(), np.arange(5.0), Streams(1))
    assert np.ptp(pose.pan) == np.ptp(pose.tilt) == np.ptp(pose.roll) == np.ptp(pose.zoom) == 0.0
    assert not SwaySettings().moves
    assert SWAY.moves
