"""A moving camera, found from the detections alone.

In each frame a similarity transform is fitted between where boxes were expected and where they
are (`tracker.kernels.camera`), trusted as far as the camera has been seen to move, and the tracks
are moved with it (`tracker.kernels.follow`). A sudden jolt is followed at once if the evidence for
it is overwhelming.

A steady pan is not told from objects that all move alike: what the tracks' own velocities explain
is no camera motion. Too few objects, or none that agree, and nothing is changed.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tracker.kernels.camera import CameraPrior
from tracker.kernels.follow import LEAST_OBJECTS, STILL, follow_camera
from tracker.kernels.warp import warp_states
from tracker.lifecycle.table import TrackTable
from tracker.log.model import Floats, Frame
from tracker.settings.schema import CameraSettings

OUTLIER_SHARE = 0.1
SIZE_REACH = 0.5  # sum of the logarithms of two size ratios


@dataclass(frozen=True, slots=True, eq=False)
class CameraStep:
    """What the camera did before a frame.

    parameters : (4,) shift x and y, zoom (0: none) and rotation (radians) about `centre` (2,).
    evidence : nats for 'it moved' against 'it did not', nan where it was measured in a video.
    support : number of objects (in a video: corners) that agree.
    """

    parameters: Floats
    centre: Floats
    evidence: float
    support: float

    def apply(self, table: TrackTable, coupled: bool) -> None:
        """Move predicted states of boxes with the image, in place."""
        warp_states(table.mean, table.covariance, self.parameters, self.centre, coupled)

    @property
    def values(self) -> tuple[float, ...]:
        """All of it in a row, in the order above."""
        return (*self.parameters.tolist(), *self.centre.tolist(), self.evidence, self.support)


class CameraMotion:
    """Estimates the camera's motion frame by frame, and moves the tracks with it."""

    def __init__(self, settings: CameraSettings) -> None:
        shift, turn = settings.shift_sigma, settings.turn_sigma
        self._prior = CameraPrior(
            reach=settings.reach,
            size_reach=SIZE_REACH,
            outlier_share=OUTLIER_SHARE,
            shift_sigma=shift,
            zoom_sigma=turn,
            rotation_sigma=turn,
            jolt_nats=settings.jolt_nats,
        )
        # What the camera is known to do: variances, lengths in box scales.
        self._learned = (STILL * np.array([shift, shift, turn, turn])) ** 2

    def follow(
        self, table: TrackTable, frame: Frame, variance: Floats, coupled: bool
    ) -> CameraStep | None:
        """Move the predicted states in place by what the camera did; None if that is not known."""
        if min(len(table), len(frame)) < LEAST_OBJECTS:
            return None
        known, fit = follow_camera(
            table.mean,
            table.covariance,
            table.hits,
            table.last_seen,
            frame.time,
            frame.z,
            variance,
            self._prior,
            self._learned,
            coupled,
        )
        return CameraStep(fit.parameters, fit.centre, fit.evidence, fit.support) if known else None
