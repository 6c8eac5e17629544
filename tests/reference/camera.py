"""Slow twin of kernels/camera.py: the whole matrix of pairs, and numpy's linear algebra."""

import numpy as np


def estimate_camera(mean, covariance, rows, z, variance, prior):
    """(θ, JᵀWJ, evidence, support, centre, scale) of the boxes `rows`."""
    box = np.maximum(mean[rows, :4], np.array([-np.inf, -np.inf, 1e-3, 1e-3]))
    scale = np.sqrt(box[:, 2] * box[:, 3])
    unit = np.median(scale)
    centre = mean[rows, :2].mean(axis=0)
    offset = z[None, :, :2] - box[:, None, :2]
    differ = np.abs(np.log(z[None, :, 2:4] / box[:, None, 2:4])).sum(axis=2)
    reach = prior.reach * scale[:, None]
    near = (np.linalg.norm(offset, axis=2) <= reach) & (differ < prior.size_reach)
    spread = covariance[rows][:, [0, 1], [0, 1]][:, None, :] + variance[None, :, :2]
    level = (
        np.log((1 - prior.outlier_share) / prior.outlier_share)
        + np.log(np.pi * reach**2)
        - np.log(2 * np.pi)
        - 0.5 * np.log(spread.prod(axis=2))
        - 0.5 * (differ / 0.15) ** 2
    )

    def best(displacement):
        rest = offset - displacement[:, None, :]
        value = np.where(near, level - 0.5 * (rest**2 / spread).sum(axis=2), -np.inf)
        return value.argmax(axis=1), value.max(axis=1)

    def design(k):
        x, y = mean[rows[k], :2] - centre
        return np.array([[1.0, 0.0, x, -y], [0.0, 1.0, y, x]])

    def displacement(theta):
        return np.array([design(k) @ theta for k in range(len(rows))])

    def likelihood(theta):
        value = best(displacement(theta))[1]
        value = value[np.isfinite(value)]
        return np.logaddexp(0.0, value).sum(), (1 / (1 + np.exp(-np.maximum(value, -500.0)))).sum()

    def equations(theta):
        chosen, value = best(displacement(theta))
        left, right = np.zeros((4, 4)), np.zeros(4)
        for k in np.flatnonzero(np.isfinite(value)):
            j = design(k)
            w = np.diag(1 / (1 + np.exp(-max(value[k], -500.0))) / spread[k, chosen[k]])
            left += j.T @ w @ j
            right += j.T @ w @ offset[k, chosen[k]]
        return left, right

    precision = np.diag(
        1.0
        / np.array([prior.shift_sigma * unit] * 2 + [prior.zoom_sigma, prior.rotation_sigma]) ** 2
    )
    by_offset = [sorted(offset[k][near[k]].tolist()) for k in range(len(rows))]
    found = np.array([o for row in by_offset for o in row]).reshape(-1, 2)
    tried = min(len(found), 64)
    shifts = [np.zeros(2)] + [found[h * len(found) // tried] for h in range(tried)]
    worth = [
        np.maximum(0.0, best(np.tile(s, (len(rows), 1)))[1]).sum() - 0.5 * precision[0, 0] * s @ s
        for s in shifts
    ]
    if np.maximum(0.0, np.where(near, level, 0.0)).max(axis=1).sum() - worth[0] < prior.jolt_nats:
        worth = worth[:1]
    theta = np.concatenate((shifts[int(np.argmax(worth))], np.zeros(2)))
    for _ in range(8):
        left, right = equations(theta)
        step = np.linalg.solve(left + precision, right) - theta
        theta = theta + step
        if np.max(np.abs(step) * np.sqrt(np.diag(left + precision))) < 1e-2:
            break
    left, _ = equations(theta)
    moving, support = likelihood(theta)
    evidence = (
        moving
        - likelihood(np.zeros(4))[0]
        - 0.5 * theta @ precision @ theta
        + 0.5 * np.linalg.slogdet(precision)[1]
        - 0.5 * np.linalg.slogdet(left + precision)[1]
    )
    return theta, left, evidence, support, centre, unit


def shrink_camera(fit_parameters, information, precision, wide_precision):
    """θ under another prior, and the variances under the first."""
    wide = information + np.diag(wide_precision)
    theta = np.linalg.solve(information + np.diag(precision), wide @ fit_parameters)
    return theta, np.diag(np.linalg.inv(wide))
