"""The two ends of each piece: what it predicts of later, and what it says of its own beginning."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tracker.hindsight.pieces import Pieces, Scans
from tracker.hindsight.smoothing import (
    Smoothable,
    batches,
    filter_forward,
    smooth_backward,
    spread_out,
)
from tracker.log.model import Floats


@dataclass(frozen=True, slots=True, eq=False)
class Ends:
    """One row a piece, in the common frame.

    mean, covariance : (P, s), (P, s, s) filtered state at the last detection.
    origin, spread : (P, d), (P, d, d) smoothed position at the first and its covariance.
    information, weighted : (P, s, s) J and (P, s) h: the piece's detections say
    exp(−½ xᵀ J x + hᵀ x) of the state x at the first, positions counted from `origin`.
    alone : (P,) ln ∫ of that against the model's state of a new object, at density 1.
    """

    mean: Floats
    covariance: Floats
    origin: Floats
    spread: Floats
    information: Floats
    weighted: Floats
    alone: Floats


def both_ends(model: Smoothable, pieces: Pieces, scans: Scans, z: Floats, variance: Floats) -> Ends:
    """Filter and smooth every piece, and keep its ends."""
    count, s = len(pieces), model.states
    mean, covariance = np.empty((count, s)), np.empty((count, s, s))
    start, start_covariance = np.empty((count, s)), np.empty((count, s, s))
    for numbers in batches(pieces):
        wanted = np.zeros(count, np.bool_)
        wanted[numbers] = True
        grid = spread_out(pieces.only(wanted))
        states = filter_forward(model, grid, scans, z, variance)
        numbers = np.flatnonzero(wanted)
        piece = numbers[grid.piece]
        mean[piece] = states.mean  # the last row of each piece is the one that stays
        covariance[piece] = states.covariance
        smooth_backward(model, grid, scans, states)
        begins = np.flatnonzero(grid.before < 0)
        start[piece[begins]] = states.mean[begins]
        start_covariance[piece[begins]] = states.covariance[begins]
    first = pieces.row[pieces.start[:-1]]
    return _ends(model, mean, covariance, start, start_covariance, z[first], variance[first])


def _ends(
    model: Smoothable,
    mean: Floats,
    covariance: Floats,
    start: Floats,
    start_covariance: Floats,
    z: Floats,
    variance: Floats,
) -> Ends:
    """Take out of each start what the model assumed of a new object: a flat position (the first
    detection is all that is known of it) and a prior of everything that is not measured."""
    d, s = model.dimension, model.states
    prior_mean, prior_covariance = model.initiate(z, variance)
    rest, rest_covariance = prior_mean[:, d:], prior_covariance[:, d:, d:]
    known = np.linalg.inv(rest_covariance)
    origin = start[:, :d].copy()
    shifted = start.copy()
    shifted[:, :d] = 0.0
    inverse = np.linalg.inv(start_covariance)
    inverse = 0.5 * (inverse + inverse.transpose(0, 2, 1))
    weighted = np.einsum("nij,nj->ni", inverse, shifted)
    level = np.einsum("ni,ni->n", shifted, weighted) + np.linalg.slogdet(start_covariance)[1]
    level -= np.einsum("ni,nij,nj->n", rest, known, rest) + np.linalg.slogdet(rest_covariance)[1]
    alone = 0.5 * (level + d * np.log(2.0 * np.pi))
    information = inverse
    information[:, d:, d:] -= known
    weighted[:, d:] -= np.einsum("nij,nj->ni", known, rest)
    assert information.shape[1:] == (s, s)
    return Ends(
        mean,
        covariance,
        origin,
        np.ascontiguousarray(start_covariance[:, :d, :d]),
        information,
        weighted,
        alone,
    )
