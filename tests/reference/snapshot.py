"""Slow twin of kernels/snapshot.py."""


def measured_part(mean, covariance, d):
    """Slices instead of loops."""
    return mean[:, :d], mean[:, d : 2 * d], covariance[:, :d, :d]
