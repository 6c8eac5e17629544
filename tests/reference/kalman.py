"""Slow twins of kernels/kalman.py: the textbook's matrices, formed in full.

Equations: Bar-Shalom, Li and Kirubarajan 2001, ch. 5 (filter) and 6 (process noise).
"""

import numpy as np


def transition(d, step):
    """F of positions followed by rates."""
    f = np.eye(2 * d)
    for a in range(d):
        f[a, d + a] = step
    return f


def process_noise(density, step):
    """Q of continuous white-noise acceleration, (2d, 2d)."""
    d = len(density)
    noise = np.zeros((2 * d, 2 * d))
    for a in range(d):
        noise[a, a] = density[a] * step**3 / 3
        noise[a, d + a] = noise[d + a, a] = density[a] * step**2 / 2
        noise[d + a, d + a] = density[a] * step
    return noise


def predict_constant_velocity(mean, covariance, step, density):
    """Predicted copies of mean and covariance."""
    d = mean.shape[1] // 2
    f = transition(d, step)
    new_mean, new_covariance = mean.copy(), covariance.copy()
    for i in range(len(mean)):
        new_mean[i] = f @ mean[i]
        new_covariance[i] = f @ covariance[i] @ f.T + process_noise(density[i], step)
    return new_mean, new_covariance


def bound_shrinking(mean, first, step_seconds):
    """The means with no size below half of what it was before the step."""
    out = np.array(mean)
    d = out.shape[1] // 2
    before = out[:, :d] - step_seconds * out[:, d:]
    for i, a in np.argwhere(out[:, :d] < 0.5 * before):
        if a >= first:
            out[i, a], out[i, d + a] = 0.5 * before[i, a], 0.0
    return out


def update_constant_velocity(mean, covariance, pairing, z, variance):
    """Corrected copies of mean and covariance, all components of a measurement at once."""
    new_mean, new_covariance = mean.copy(), covariance.copy()
    d = mean.shape[1] // 2
    h = np.hstack((np.eye(d), np.zeros((d, d))))
    for i, j in enumerate(pairing):
        if j < 0:
            continue
        x, p, r = new_mean[i], new_covariance[i], np.diag(variance[j])
        s = h @ p @ h.T + r
        gain = p @ h.T @ np.linalg.inv(s)
        rest = np.eye(2 * d) - gain @ h
        new_mean[i] = x + gain @ (z[j] - h @ x)
        new_covariance[i] = rest @ p @ rest.T + gain @ r @ gain.T
    return new_mean, new_covariance


def squared_mahalanobis(mean, covariance, i, z, variance, j):
    """d² and ln det S, or two infinities if S is not positive definite."""
    d = z.shape[1]
    s = covariance[i, :d, :d] + np.diag(variance[j])
    if not (np.isfinite(s).all() and np.linalg.eigvalsh(s).min() > 0):
        return np.inf, np.inf
    innovation = z[j] - mean[i, :d]
    return innovation @ np.linalg.inv(s) @ innovation, np.log(np.linalg.det(s))


def initiate_constant_velocity(z, variance, rate_variance):
    """Means and covariances of new tracks."""
    mean = [np.concatenate((one, np.zeros(len(one)))) for one in z]
    covariance = [
        np.diag(np.concatenate(pair)) for pair in zip(variance, rate_variance, strict=True)
    ]
    return np.array(mean), np.array(covariance)
