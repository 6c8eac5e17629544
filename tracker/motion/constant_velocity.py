"""Nearly constant velocity: settings turned into noise arrays, kernels called on them."""

from __future__ import annotations

import numpy as np

from tracker.errors import KernelError
from tracker.kernels.kalman import (
    UPDATE_OF_DIMENSION,
    UPDATE_OK,
    initiate_constant_velocity,
    predict_constant_velocity,
)
from tracker.kernels.noise import axis_squares
from tracker.log.model import Floats, Ints, Kind
from tracker.settings.schema import Settings


class ConstantVelocity:
    """Constant velocity driven by continuous white-noise acceleration.

    Noise levels of boxes are in box scales, so near and far objects are treated alike; those of
    points in the log's own unit. States are (measured components, their rates).

    coupled : whether the axes of the covariances may be correlated. Nothing here correlates them.
    """

    coupled = False

    def __init__(self, settings: Settings, kind: Kind) -> None:
        self.dimension = kind.dimension
        self.states = 2 * kind.dimension
        self._update = UPDATE_OF_DIMENSION[kind.dimension]
        self._motion = settings.motion
        self._measurement = settings.measurement
        self._boxes = kind is Kind.BOX
        unit = settings.measurement.unit
        self._scaled = self._boxes if unit == "auto" else unit == "box-scales"

    def predict(self, mean: Floats, covariance: Floats, step_seconds: float) -> None:
        """Move (n, s) states forward in place."""
        if step_seconds == 0.0 or not len(mean):
            return
        density = axis_squares(
            mean,
            self.dimension,
            self._motion.acceleration_noise,
            self._motion.size_noise,
            self._boxes,
        )
        predict_constant_velocity(mean, covariance, step_seconds, density, self.coupled)

    def measurement_variance(self, z: Floats, sigma: Floats | None) -> Floats:
        """(m, d) variances of detections: from their sigma columns, else from the settings."""
        variance = axis_squares(
            z,
            self.dimension,
            self._measurement.position_sigma,
            self._measurement.size_sigma,
            self._scaled,
        )
        if sigma is None:
            return variance
        return np.where(np.isnan(sigma), variance, sigma * sigma)

    def update(
        self, mean: Floats, covariance: Floats, pairing: Ints, z: Floats, variance: Floats
    ) -> None:
        """Correct (n, s) states in place, each by detection ``pairing[i]`` of z, -1 for none.

        Raises KernelError if an innovation variance is not positive.
        """
        status = self._update(mean, covariance, pairing, z, variance, self.coupled)
        if status != UPDATE_OK:
            raise KernelError(f"the innovation variance of table row {status} is not positive")

    def initiate(self, z: Floats, variance: Floats) -> tuple[Floats, Floats]:
        """(k, s) and (k, s, s) states of new tracks: at the detection, at rest."""
        rates = axis_squares(
            z,
            self.dimension,
            self._motion.initial_speed_sigma,
            self._motion.initial_size_rate_sigma,
            self._boxes,
        )
        mean = np.empty((len(z), self.states))
        covariance = np.empty((len(z), self.states, self.states))
        initiate_constant_velocity(z, variance, rates, mean, covariance)
        return mean, covariance
