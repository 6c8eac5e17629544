"""Following a camera over frames: what is looked at, how far it is trusted, what is learned.

How far the fit is trusted is learned on the way: a running mean of what the camera did, less what
estimation noise alone would show, is the variance of the prior (empirical Bayes; Robbins 1956, from
memory). A camera that stands still teaches a variance of nearly zero, so that its states are left
alone.
"""

from __future__ import annotations

import numpy as np
from numba import njit
from numpy.typing import NDArray

from tracker.kernels.camera import (
    PARAMETERS,
    CameraFit,
    CameraPrior,
    estimate_camera,
    shrink_camera,
)
from tracker.kernels.warp import warp_states

FRESH_SECONDS = 0.25  # a track that was not seen for longer is not looked at
LEAST_OBJECTS = 3  # fewer tracks or detections say nothing
MOST_OBJECTS = 32  # of more tracks than that, so many are drawn
LEAST_SUPPORT = 2.0  # agreeing objects below which nothing is learned
MEMORY = 0.9  # weight of the past in what the camera is known to do, at each frame
STILL = 0.01  # a camera is never thought stiller than this share of a jolt's sigmas
GOLDEN_RATIO = 0.6180339887498949  # its multiples are spread evenly (Knuth 1998, 6.4)


@njit(cache=True)
def follow_camera(
    mean: NDArray[np.float64],
    covariance: NDArray[np.float64],
    hits: NDArray[np.int64],
    last_seen: NDArray[np.float64],
    now: float,
    z: NDArray[np.float64],
    variance: NDArray[np.float64],
    prior: CameraPrior,
    learned: NDArray[np.float64],
    coupled: bool,
) -> tuple[bool, CameraFit]:
    """Find what the camera did, move the states with it and learn from it, in place.

    mean, covariance : (n, 8), (n, 8, 8) predicted states of boxes.   hits, last_seen : (n,).
    learned : (4,) variances of the prior, lengths in box scales.

    Returns whether anything was known, and the fit, its parameters those that were applied.
    """
    rows = reliable_rows(mean, hits, last_seen, now)
    if len(rows) < LEAST_OBJECTS or len(z) < LEAST_OBJECTS:
        nothing = np.zeros((PARAMETERS, PARAMETERS))
        return False, CameraFit(np.zeros(PARAMETERS), nothing, 0.0, 0.0, np.zeros(2), 0.0)
    fit = estimate_camera(mean, covariance, rows, z, variance, prior)
    unit = np.array([fit.scale, fit.scale, 1.0, 1.0]) ** 2
    wide = (
        np.array([prior.shift_sigma, prior.shift_sigma, prior.zoom_sigma, prior.rotation_sigma])
        ** 2
    )
    parameters, spread = shrink_camera(
        fit.parameters, fit.information, 1.0 / (learned * unit), 1.0 / (wide * unit)
    )
    if fit.evidence > prior.jolt_nats:
        parameters = fit.parameters
    if fit.support >= LEAST_SUPPORT:
        for a in range(PARAMETERS):
            seen = max(fit.parameters[a] ** 2 - spread[a], 0.0) / unit[a]
            learned[a] = max(MEMORY * learned[a] + (1.0 - MEMORY) * seen, STILL**2 * wide[a])
    warp_states(mean, covariance, parameters, fit.centre, coupled)
    return True, CameraFit(
        parameters, fit.information, fit.evidence, fit.support, fit.centre, fit.scale
    )


@njit(cache=True)
def reliable_rows(
    mean: NDArray[np.float64],
    hits: NDArray[np.int64],
    last_seen: NDArray[np.float64],
    now: float,
) -> NDArray[np.int64]:
    """Rows of tracks that were seen more than once, and lately; a part of them if many.

    Which, and in what order, depends on where they are and not on their ids, so that nothing
    depends on the order of detections in a frame or on the unit of length.
    """
    rows = np.empty(len(mean), np.int64)
    count = 0
    for i in range(len(mean)):
        if hits[i] > 1 and now - last_seen[i] <= FRESH_SECONDS:
            rows[count] = i
            count += 1
    rows = rows[:count]
    if count > MOST_OBJECTS:
        lot = np.empty(count)
        for k in range(count):
            lot[k] = abs(mean[rows[k], 0] / mean[rows[k], 3]) * GOLDEN_RATIO % 1.0
        limit = np.partition(lot, MOST_OBJECTS - 1)[MOST_OBJECTS - 1]
        rows = rows[lot <= limit]
    return rows[np.argsort(mean[rows, 0], kind="mergesort")]
