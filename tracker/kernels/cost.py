"""Costs of candidates, in nats: minus the log-likelihood ratio of 'same object' against 'new'."""

from __future__ import annotations

import numpy as np
from numba import njit
from numpy.typing import NDArray

LOG_TWO_PI = 1.8378770664093453


@njit(cache=True)
def overlap_term(overlap: NDArray[np.float64], nats: float, neutral: float) -> NDArray[np.float64]:
    """(E,) nats · (neutral − IoU)."""
    out = np.empty(len(overlap))
    for e in range(len(overlap)):
        out[e] = nats * (neutral - overlap[e])
    return out


@njit(cache=True)
def mahalanobis_term(distance: NDArray[np.float64], threshold: float) -> NDArray[np.float64]:
    """(E,) ½ (d² − γ): neutral at the edge of the gate."""
    out = np.empty(len(distance))
    for e in range(len(distance)):
        out[e] = 0.5 * (distance[e] - threshold)
    return out


@njit(cache=True)
def likelihood_term(
    distance: NDArray[np.float64],
    log_volume: NDArray[np.float64],
    dimension: int,
    log_new_density: float,
) -> NDArray[np.float64]:
    """(E,) ½ d² + ½ ln det(2πS) + ln λ_new (Sittler 1964; Blackman and Popoli 1999)."""
    out = np.empty(len(distance))
    for e in range(len(distance)):
        log_likelihood = -0.5 * (distance[e] + log_volume[e] + dimension * LOG_TWO_PI)
        out[e] = log_new_density - log_likelihood
    return out
