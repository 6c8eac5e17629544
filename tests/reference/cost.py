"""Slow twins of kernels/cost.py, with scipy's densities."""

import math

from scipy.stats import norm


def overlap_term(overlap, nats, neutral):
    """nats · (neutral − IoU)."""
    return [nats * (neutral - shared) for shared in overlap]


def mahalanobis_term(distance, threshold):
    """Half of d² minus the gate."""
    return [(d2 - threshold) / 2 for d2 in distance]


def likelihood_term(innovation, sigma, new_density):
    """−ln [N(innovation; 0, diag σ²) / λ_new] for independent components."""
    density = math.prod(norm.pdf(v, scale=s) for v, s in zip(innovation, sigma, strict=True))
    return -math.log(density / new_density)
