"""Nearly constant velocity: settings turned into noise arrays, kernels called on them."""

from __future__ import annotations

import numpy as np

from tracker.errors import KernelError, SettingsError, UsageError
from tracker.kernels.joint_update import Mixture, joint_update
from tracker.kernels.kalman import (
    UPDATE_OK,
    bound_shrinking,
    initiate_constant_velocity,
    predict_constant_velocity,
    update_constant_velocity,
)
from tracker.kernels.noise import SIGMAS_OK, axis_squares, overwrite_variances
from tracker.log.model import Floats, Ints, Kind
from tracker.settings.schema import Settings


class ConstantVelocity:
    """Constant velocity driven by continuous white-noise acceleration.

    States are (measured components, their rates): (n, s) means, (n, s, s) covariances, in the
    log's own length unit and seconds. The settings' noise levels are in box scales for boxes, so
    that near and far objects are treated alike, and in the length unit for points.

    coupled : whether the axes of the covariances may be correlated; only `update_jointly`
    correlates them.

    Raises SettingsError for measurement noise in box scales where nothing is a box.
    """

    def __init__(self, settings: Settings, kind: Kind) -> None:
        motion, measurement = settings.motion, settings.measurement
        self._boxes = boxes = kind is Kind.BOX
        if measurement.unit == "box-scales" and not boxes:
            raise SettingsError(
                "box scales need boxes, these are points; set it to 'absolute' or 'auto'",
                setting="measurement.unit",
            )
        self.coupled = settings.association.mode == "joint-probabilistic"
        self.dimension = kind.dimension
        self.states = 2 * kind.dimension
        # (noise on position axes, on size axes, whether in box scales)
        self._density = (motion.acceleration_noise, motion.size_noise, boxes)
        self._rate = (motion.initial_speed_sigma, motion.initial_size_rate_sigma, boxes)
        self._measured = (
            measurement.position_sigma,
            measurement.size_sigma,
            boxes and measurement.unit != "absolute",
        )

    def predict(self, mean: Floats, covariance: Floats, step_seconds: float) -> None:
        """Move (n, s) states forward in place; a box's scale is that before the step."""
        if step_seconds == 0.0 or not len(mean):
            return
        density = axis_squares(mean, self.dimension, *self._density)
        predict_constant_velocity(mean, covariance, step_seconds, density, self.coupled)
        if self._boxes:
            bound_shrinking(mean, 2, step_seconds)

    def transition(self, mean: Floats, step_seconds: float) -> Floats:
        """(n, s, s) F of (n, s) states, the same for all of them."""
        step = np.eye(self.states)
        step[np.arange(self.dimension), self.dimension + np.arange(self.dimension)] = step_seconds
        return np.repeat(step[None], len(mean), axis=0)

    def measurement_variance(self, z: Floats, sigma: Floats | None) -> Floats:
        """(m, d) variances of detections: from their sigmas, where nan or none from the settings.

        Raises UsageError for a sigma that is no positive number. (A log's are checked when it is
        read.)
        """
        variance = axis_squares(z, self.dimension, *self._measured)
        if sigma is not None:
            row = overwrite_variances(variance, sigma)
            if row != SIGMAS_OK:
                raise UsageError(
                    f"detection {row} of the frame has sigmas {sigma[row].tolist()}; they are "
                    "positive standard deviations, or nan for what the settings say"
                )
        return variance

    def update(
        self, mean: Floats, covariance: Floats, pairing: Ints, z: Floats, variance: Floats
    ) -> None:
        """Correct (n, s) states in place, each by detection ``pairing[i]`` of z, -1 for none.

        Raises KernelError if an innovation covariance is not positive definite.
        """
        status = update_constant_velocity(mean, covariance, pairing, z, variance, self.coupled)
        if status != UPDATE_OK:
            raise KernelError(
                f"the innovation covariance of table row {status} is not positive definite"
            )

    def update_jointly(
        self, mean: Floats, covariance: Floats, mixture: Mixture, z: Floats, variance: Floats
    ) -> None:
        """Correct (n, s) states in place, each by the weighted combination of its alternatives.

        Raises KernelError if an innovation covariance is not positive definite.
        """
        status = joint_update(mean, covariance, mixture, z, variance)
        if status != UPDATE_OK:
            raise KernelError(
                f"the innovation covariance of table row {status} is not positive definite"
            )

    def initiate(self, z: Floats, variance: Floats) -> tuple[Floats, Floats]:
        """(k, s) and (k, s, s) states of new tracks: at the detection, at rest."""
        rates = axis_squares(z, self.dimension, *self._rate)
        mean = np.empty((len(z), self.states))
        covariance = np.empty((len(z), self.states, self.states))
        initiate_constant_velocity(z, variance, rates, mean, covariance)
        return mean, covariance
