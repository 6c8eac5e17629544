"""A mast that moves in the wind, and with it the camera."""

from __future__ import annotations

from typing import Annotated

import numpy as np

from tracker.log.model import Floats
from tracker.settings.fields import NonNegative, Positive, about
from tracker.simulation.sensors.projection import CameraSettings, Pose
from tracker.simulation.settings import Section
from tracker.simulation.streams import Streams

HARMONICS = 24


class SwaySettings(Section, frozen=True):
    """Angles and zoom as Gaussian noise in a band around the mast's own frequency."""

    pan_sigma_degrees: Annotated[
        float, NonNegative, about("Standard deviation of the pan", "degrees")
    ] = 0.0
    tilt_sigma_degrees: Annotated[
        float, NonNegative, about("Standard deviation of the tilt", "degrees")
    ] = 0.0
    roll_sigma_degrees: Annotated[
        float, NonNegative, about("Standard deviation of the roll", "degrees")
    ] = 0.0
    zoom_sigma: Annotated[
        float, NonNegative, about("Standard deviation of the zoom factor", "of the focal length")
    ] = 0.0
    frequency_hz: Annotated[float, Positive, about("The mast's own frequency", "1/s")] = 0.45
    bandwidth_hz: Annotated[
        float, NonNegative, about("Standard deviation of the frequencies around it", "1/s")
    ] = 0.15

    @property
    def moves(self) -> bool:
        return any(
            (
                self.pan_sigma_degrees,
                self.tilt_sigma_degrees,
                self.roll_sigma_degrees,
                self.zoom_sigma,
            )
        )


def camera_pose(
    camera: CameraSettings, sway: SwaySettings, times: Floats, streams: Streams
) -> Pose:
    """The camera's pose at each of the (n,) times.

    A sum of harmonics with random frequencies and phases, which tends to a stationary Gaussian
    process (spectral representation, Shinozuka and Jan 1972, from memory) and can be evaluated
    at any time.
    """
    degrees = np.pi / 180.0
    return Pose(
        pan=sway.pan_sigma_degrees * degrees * _wave("pan", sway, times, streams),
        tilt=(camera.tilt_degrees + sway.tilt_sigma_degrees * _wave("tilt", sway, times, streams))
        * degrees,
        roll=sway.roll_sigma_degrees * degrees * _wave("roll", sway, times, streams),
        zoom=1.0 + sway.zoom_sigma * _wave("zoom", sway, times, streams),
    )


def _wave(what: str, sway: SwaySettings, times: Floats, streams: Streams) -> Floats:
    """(n,) of variance 1 over the phases."""
    rng = streams(f"sway {what}")
    frequency = np.abs(sway.frequency_hz + sway.bandwidth_hz * rng.standard_normal(HARMONICS))
    phase = 2.0 * np.pi * rng.random(HARMONICS)
    wave = np.cos(2.0 * np.pi * frequency * times[:, None] + phase)
    return np.sqrt(2.0 / HARMONICS) * wave.sum(axis=1)
