"""Slow twins of kernels/joint_update.py: mixture moments, and the textbook's PDA equations."""

import numpy as np

from tests.reference.kalman import update_constant_velocity


def joint_update(mean, covariance, alternatives, z, variance):
    """Copies of the states, corrected by [(detection, weight), …] each, as Gaussian mixtures."""
    new_mean, new_covariance = mean.copy(), covariance.copy()
    for i, options in enumerate(alternatives):
        weights = [1.0 - sum(weight for _, weight in options)]
        means, covariances = [mean[i]], [covariance[i]]
        for detection, weight in options:
            x, p = update_constant_velocity(
                mean[i : i + 1], covariance[i : i + 1], [detection], z, variance
            )
            weights.append(weight)
            means.append(x[0])
            covariances.append(p[0])
        centre = np.average(means, axis=0, weights=weights)
        new_mean[i] = centre
        new_covariance[i] = sum(
            w * (p + np.outer(x - centre, x - centre))
            for w, x, p in zip(weights, means, covariances, strict=True)
        )
    return new_mean, new_covariance


def probabilistic_data_association(x, p, z, r, weights):
    """One track, detections with a common R (Bar-Shalom and Tse 1975; Bar-Shalom, Li 1995)."""
    d = len(r)
    h = np.hstack((np.eye(d), np.zeros((d, d))))
    s = h @ p @ h.T + r
    gain = p @ h.T @ np.linalg.inv(s)
    innovation = z - h @ x
    combined = weights @ innovation
    none = 1.0 - weights.sum()
    spread = (weights[:, None] * innovation).T @ innovation - np.outer(combined, combined)
    corrected = p - gain @ s @ gain.T
    return (
        x + gain @ combined,
        none * p + (1.0 - none) * corrected + gain @ spread @ gain.T,
    )
