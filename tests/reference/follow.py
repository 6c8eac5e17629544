"""Slow twins of kernels/follow.py, from those of the camera."""

import numpy as np

from tests.reference.camera import estimate_camera, shrink_camera
from tests.reference.warp import warp_states


def reliable_rows(mean, hits, last_seen, now):
    """Rows in order of place: seen twice and within 0.25 s; the 32 of lowest lot if more."""
    rows = [i for i in range(len(mean)) if hits[i] > 1 and now - last_seen[i] <= 0.25]
    if len(rows) > 32:
        rows.sort(key=lambda i: abs(mean[i, 0] / mean[i, 3]) * 0.6180339887498949 % 1.0)
        rows = rows[:32]
    return sorted(rows, key=lambda i: mean[i, 0])


def follow_camera(mean, covariance, hits, last_seen, now, z, variance, prior, learned):
    """(means, covariances, learned variances, θ) after the frame; None if nothing is known."""
    rows = reliable_rows(mean, hits, last_seen, now)
    if len(rows) < 3 or len(z) < 3:
        return None
    found, information, evidence, support, centre, scale = estimate_camera(
        mean, covariance, np.array(rows), z, variance, prior
    )
    unit = np.array([scale**2, scale**2, 1.0, 1.0])
    sigma = np.array([prior.shift_sigma] * 2 + [prior.zoom_sigma, prior.rotation_sigma])
    theta, spread = shrink_camera(found, information, 1 / (learned * unit), 1 / (sigma**2 * unit))
    if evidence > prior.jolt_nats:
        theta = found
    if support >= 2.0:
        seen = np.maximum(found**2 - spread, 0) / unit
        learned = np.maximum(0.9 * learned + 0.1 * seen, (0.01 * sigma) ** 2)
    return (*warp_states(mean, covariance, theta, centre), learned, theta)
