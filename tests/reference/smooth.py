"""Slow twin of kernels/smooth.py: the equations with the inverse written out."""

import numpy as np


def smooth_step(mean, covariance, predicted_mean, predicted_covariance, transition, later):
    """Smoothed copies of mean and covariance; later : (mean, covariance) one scan on."""
    new_mean, new_covariance = mean.copy(), covariance.copy()
    for i in range(len(mean)):
        gain = covariance[i] @ transition[i].T @ np.linalg.inv(predicted_covariance[i])
        new_mean[i] = mean[i] + gain @ (later[0][i] - predicted_mean[i])
        change = later[1][i] - predicted_covariance[i]
        new_covariance[i] = covariance[i] + gain @ change @ gain.T
    return new_mean, new_covariance
