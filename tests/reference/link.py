"""Slow twin of kernels/link.py: the integral as a product of normals, by scipy."""

import numpy as np
from scipy.stats import multivariate_normal


def link_evidence(mean, covariance, later, origin, information, weighted, start_covariance):
    """ln ∫ N(x; mean, covariance) exp(−½ xᵀ J x + hᵀ x) dx and d² of each pair.

    For an invertible J and p = J⁻¹ h that is
    exp(½ hᵀ p) (2π)^(s/2) |J|^(−½) N(mean; p, covariance + J⁻¹).
    """
    evidence, distance = [], []
    s, d = mean.shape[1], origin.shape[1]
    for e, j in enumerate(later):
        f = mean[e].copy()
        f[:d] -= origin[j]
        inverse = np.linalg.inv(information[j])
        peak = inverse @ weighted[j]
        value = 0.5 * weighted[j] @ peak + 0.5 * s * np.log(2 * np.pi)
        value += 0.5 * np.linalg.slogdet(inverse)[1]
        value += multivariate_normal(peak, covariance[e] + inverse).logpdf(f)
        evidence.append(value)
        total = covariance[e, :d, :d] + start_covariance[j]
        distance.append(f[:d] @ np.linalg.inv(total) @ f[:d])
    return np.array(evidence), np.array(distance)
