"""Slow twin of kernels/gate.py: every pair, dense algebra."""

import numpy as np

from tests.reference.overlap import box_overlap


def gate_candidates(mean, covariance, z, variance, threshold, overlap_floor, boxes):
    """List of (row, column, d², ln det S, IoU) of the pairs inside the gate, row by row."""
    found = []
    d = z.shape[1]
    for i in range(len(mean)):
        for j in range(len(z)):
            innovation = z[j] - mean[i, :d]
            s = covariance[i, :d, :d] + np.diag(variance[j])
            d2 = innovation @ np.linalg.solve(s, innovation)
            shared = box_overlap(mean[i], z[j]) if boxes else 0.0
            if d2 <= threshold and shared >= overlap_floor:
                found.append((i, j, d2, np.linalg.slogdet(s)[1], shared))
    return found
