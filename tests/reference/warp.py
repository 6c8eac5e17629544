"""Slow twin of kernels/warp.py: whole matrices."""

import numpy as np


def warp_states(mean, covariance, parameters, centre):
    """The states after the transform, each axis correlated with each."""
    shift, zoom, turn = parameters[:2], 1.0 + parameters[2], parameters[3]
    block = np.array([[zoom, -turn], [turn, zoom]])
    half = mean.shape[1] // 2
    whole = np.eye(2 * half) * zoom
    whole[:2, :2] = block
    whole[half : half + 2, half : half + 2] = block
    moved = np.array(mean)
    moved[:, :2] -= centre
    moved = moved @ whole.T
    moved[:, :2] += centre + shift
    return moved, np.array([whole @ p @ whole.T for p in covariance])
