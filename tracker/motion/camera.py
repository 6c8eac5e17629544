"""A moving camera, found from the detections alone.

In each frame a similarity transform is fitted between where boxes were expected and where they
are (`tracker.kernels.camera`). How far it is trusted is learned on the way: a running mean of
what the camera did, less what estimation noise alone would show, is the variance of the prior
(empirical Bayes; Robbins 1956, from memory). A camera that stands still teaches a variance of
zero, so that its states are left alone; one that moves is followed. A sudden jolt is followed at
once if the evidence for it is overwhelming.

A steady pan is not told from objects that all move alike: what the tracks' own velocities explain
is no camera motion. Too few objects, or none that agree, and nothing is changed.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tracker.kernels.camera import CameraPrior, estimate_camera, shrink_camera
from tracker.kernels.warp import warp_states
from tracker.lifecycle.table import TrackTable
from tracker.log.model import Floats, Frame, Ints
from tracker.settings.schema import CameraSettings

OUTLIER_SHARE = 0.1
SIZE_REACH = 0.5  # sum of the logarithms of two size ratios
FRESH_SECONDS = 0.25  # a track that was not seen for longer is not looked at
LEAST_OBJECTS = 3  # fewer tracks or detections say nothing
MOST_OBJECTS = 32  # of more tracks than that, so many are drawn
LEAST_SUPPORT = 2.0  # agreeing objects below which nothing is learned
MEMORY = 0.9  # weight of the past in what the camera is known to do, at each frame
GOLDEN_RATIO = 0.6180339887498949  # its multiples are spread evenly (Knuth 1998, 6.4)
STILL = 0.01  # a camera is never thought stiller than this share of a jolt's sigmas


@dataclass(frozen=True, slots=True, eq=False)
class CameraStep:
    """What the camera did before a frame.

    parameters : (4,) shift x and y, zoom (0: none) and rotation (radians) about `centre` (2,).
    evidence : nats for 'it moved' against 'it did not'.   support : number of objects that agree.
    """

    parameters: Floats
    centre: Floats
    evidence: float
    support: float

    @property
    def values(self) -> tuple[float, ...]:
        """All of it in a row, in the order above."""
        return (*self.parameters.tolist(), *self.centre.tolist(), self.evidence, self.support)


class CameraMotion:
    """Estimates the camera's motion frame by frame, and moves the tracks with it."""

    def __init__(self, settings: CameraSettings) -> None:
        self._jolt = settings.jolt_nats
        self._prior = CameraPrior(
            reach=settings.reach,
            size_reach=SIZE_REACH,
            outlier_share=OUTLIER_SHARE,
            shift_sigma=settings.shift_sigma,
            zoom_sigma=settings.turn_sigma,
            rotation_sigma=settings.turn_sigma,
            jolt_nats=settings.jolt_nats,
        )
        turn = settings.turn_sigma
        self._wide = np.array([settings.shift_sigma, settings.shift_sigma, turn, turn]) ** 2
        self._least = self._wide * STILL**2
        self._variance = self._least.copy()  # what the camera is known to do, in the same units

    def follow(
        self, table: TrackTable, frame: Frame, variance: Floats, coupled: bool
    ) -> CameraStep | None:
        """Move the predicted states in place by what the camera did; None if that is not known."""
        if min(len(table), len(frame)) < LEAST_OBJECTS:
            return None
        rows = self._reliable(table, frame.time)
        if len(rows) < LEAST_OBJECTS:
            return None
        fit = estimate_camera(table.mean, table.covariance, rows, frame.z, variance, self._prior)
        unit = np.array([fit.scale, fit.scale, 1.0, 1.0]) ** 2
        parameters, spread = shrink_camera(
            fit.parameters,
            fit.information,
            1.0 / (self._variance * unit),
            1.0 / (self._wide * unit),
        )
        if fit.evidence > self._jolt:
            parameters = fit.parameters
        if fit.support >= LEAST_SUPPORT:
            seen = np.maximum(fit.parameters**2 - spread, 0.0) / unit
            learned = MEMORY * self._variance + (1.0 - MEMORY) * seen
            self._variance = np.maximum(learned, self._least)
        warp_states(table.mean, table.covariance, parameters, fit.centre, coupled)
        return CameraStep(parameters, fit.centre, fit.evidence, fit.support)

    @staticmethod
    def _reliable(table: TrackTable, now: float) -> Ints:
        """Rows of tracks that were seen more than once, and lately; a part of them if many.

        Which, and in what order, depends on where they are and not on their ids, so that nothing
        depends on the order of detections in a frame or on the unit of length.
        """
        fresh = now - table.last_seen <= FRESH_SECONDS
        rows = np.flatnonzero((table.hits > 1) & fresh)
        if len(rows) > MOST_OBJECTS:
            lot = np.abs(table.mean[rows, 0] / table.mean[rows, 3]) * GOLDEN_RATIO % 1.0
            rows = rows[np.argpartition(lot, MOST_OBJECTS)[:MOST_OBJECTS]]
        return rows[np.argsort(table.mean[rows, 0], kind="stable")]
