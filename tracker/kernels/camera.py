"""The motion of a camera between two frames, from predicted boxes and detected ones.

Where a camera moves, all objects leave their predictions by one and the same transform of the
image. A point p moves by

    u(p) = (shift_x, shift_y) + zoom (p − c) + rotation (p − c)⊥,   (a, b)⊥ = (−b, a),

a similarity transform, linear in its four parameters θ, with c the mean of the boxes used.

Which detection belongs to which box is not known yet, so consensus comes first (Fischler and
Bolles 1981; here all hypotheses of a shift are tried, not a random sample), then least squares
reweighted by the probability that the pair belongs together (Holland and Welsch 1977).
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numba import njit
from numpy.typing import NDArray

from tracker.kernels.cholesky import factorise, solve_factored

PARAMETERS = 4  # shift x, shift y, zoom, rotation
MOST_HYPOTHESES = 64
MOST_ROUNDS = 8
SETTLED = 1e-2  # of a standard deviation of the estimate
SIZE_SIGMA = 0.15  # of the logarithms of width and height between two detections of an object
LOG_TWO_PI = 1.8378770664093453
SMALLEST_SIDE = 1e-3


class CameraPrior(NamedTuple):
    """What is thought of the camera's motion before a frame is seen."""

    reach: float  # farthest that an object is looked for, in box scales
    size_reach: float  # largest sum of the two logarithms of size ratios
    outlier_share: float  # chance that an object has no detection, or a wrong one only
    shift_sigma: float  # box scales
    zoom_sigma: float
    rotation_sigma: float  # radians
    jolt_nats: float  # a shift that could gain less than that over none is not looked for


class CameraFit(NamedTuple):
    """The transform that fits best."""

    parameters: NDArray[np.float64]  # (4,) most probable θ under the prior
    information: NDArray[np.float64]  # (4, 4) what the data alone say: Jᵀ W J
    evidence: float  # ln of the Bayes factor of 'the camera moved' against 'it did not', Laplace
    support: float  # number of boxes that agree, each by its probability
    centre: NDArray[np.float64]  # (2,) c
    scale: float  # median box scale, the unit of shift_sigma


class _Pairs(NamedTuple):
    start: NDArray[np.int64]  # (n + 1,) pairs of each box
    offset: NDArray[np.float64]  # (E, 2) detection minus prediction
    variance: NDArray[np.float64]  # (E, 2) of that, prediction and detection together
    level: NDArray[np.float64]  # (E,) ln of likelihood against outlier at offset 0


@njit(cache=True)
def estimate_camera(
    mean: NDArray[np.float64],
    covariance: NDArray[np.float64],
    rows: NDArray[np.int64],
    z: NDArray[np.float64],
    variance: NDArray[np.float64],
    prior: CameraPrior,
) -> CameraFit:
    """Fit the transform that moves the predicted boxes ``rows`` onto detections.

    mean, covariance : (n, s), (n, s, s) predicted states of boxes.   rows : (k,) those to use,
    k > 0.   z, variance : (m, 4) detections.
    """
    centre = np.zeros(2)
    scales = np.empty(len(rows))
    for k in range(len(rows)):
        i = rows[k]
        centre[0] += mean[i, 0] / len(rows)
        centre[1] += mean[i, 1] / len(rows)
        scales[k] = _scale(mean, i)
    scale = float(np.median(scales))
    precision = np.array(
        [
            1.0 / (prior.shift_sigma * scale) ** 2,
            1.0 / (prior.shift_sigma * scale) ** 2,
            1.0 / prior.zoom_sigma**2,
            1.0 / prior.rotation_sigma**2,
        ]
    )
    pairs = _near_pairs(mean, covariance, rows, z, variance, scales, prior)
    theta = np.zeros(PARAMETERS)
    still, _ = _support(pairs, mean, rows, centre, theta)
    theta[:2] = _best_shift(pairs, precision[0], prior.jolt_nats)
    information = np.zeros((PARAMETERS, PARAMETERS))
    for _ in range(MOST_ROUNDS):
        pull = _normal_equations(pairs, mean, rows, centre, theta, information)
        posterior = information.copy()
        for a in range(PARAMETERS):
            posterior[a, a] += precision[a]
        factor = factorise(posterior)
        step = solve_factored(factor, pull) - theta
        theta += step
        moved = 0.0
        for a in range(PARAMETERS):
            moved = max(moved, abs(step[a]) * np.sqrt(posterior[a, a]))
        if moved < SETTLED:
            break
    _normal_equations(pairs, mean, rows, centre, theta, information)
    moving, support = _support(pairs, mean, rows, centre, theta)
    posterior = information.copy()
    evidence = moving - still
    for a in range(PARAMETERS):
        posterior[a, a] += precision[a]
        evidence += 0.5 * np.log(precision[a]) - 0.5 * precision[a] * theta[a] ** 2
    factor = factorise(posterior)
    for a in range(PARAMETERS):
        evidence -= np.log(factor[a, a])
    return CameraFit(theta, information, evidence, support, centre, scale)


@njit(cache=True)
def shrink_camera(
    fit_parameters: NDArray[np.float64],
    information: NDArray[np.float64],
    precision: NDArray[np.float64],
    wide_precision: NDArray[np.float64],
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """θ under another prior, and the variances of θ under the first one: (4,), (4,).

    fit_parameters : (4,) θ found under a prior of precisions ``wide_precision``.
    """
    wide = information.copy()
    own = information.copy()
    for a in range(PARAMETERS):
        wide[a, a] += wide_precision[a]
        own[a, a] += precision[a]
    pull = np.zeros(PARAMETERS)
    for a in range(PARAMETERS):
        for b in range(PARAMETERS):
            pull[a] += wide[a, b] * fit_parameters[b]
    factor = factorise(wide)
    spread = np.empty(PARAMETERS)
    for a in range(PARAMETERS):
        unit = np.zeros(PARAMETERS)
        unit[a] = 1.0
        spread[a] = solve_factored(factor, unit)[a]
    return solve_factored(factorise(own), pull), spread


@njit(cache=True)
def _scale(mean: NDArray, i: int) -> float:
    """Square root of width times height."""
    return np.sqrt(max(mean[i, 2], SMALLEST_SIDE) * max(mean[i, 3], SMALLEST_SIDE))


@njit(cache=True)
def _near_pairs(
    mean: NDArray,
    covariance: NDArray,
    rows: NDArray,
    z: NDArray,
    variance: NDArray,
    scales: NDArray,
    prior: CameraPrior,
) -> _Pairs:
    """Box and detection within reach and of about the same size.

    Those of a box are in order of their offset, whatever the order of detections. The likelihood
    of an offset is normal, against an outlier that may be anywhere within reach.
    """
    start = np.zeros(len(rows) + 1, np.int64)
    room = 4 * len(rows) + 16
    offset = np.empty((room, 2))
    spread = np.empty((room, 2))
    level = np.empty(room)
    count = 0
    for k in range(len(rows)):
        i = rows[k]
        reach = prior.reach * scales[k]
        for j in range(len(z)):
            dx = z[j, 0] - mean[i, 0]
            dy = z[j, 1] - mean[i, 1]
            if abs(dx) > reach or abs(dy) > reach or dx * dx + dy * dy > reach * reach:
                continue
            differ = abs(np.log(z[j, 2] / max(mean[i, 2], SMALLEST_SIDE)))
            differ += abs(np.log(z[j, 3] / max(mean[i, 3], SMALLEST_SIDE)))
            if not differ < prior.size_reach:
                continue
            if count == room:
                room *= 2
                offset, spread, level = _grown(offset, spread, level, room)
            sx = covariance[i, 0, 0] + variance[j, 0]
            sy = covariance[i, 1, 1] + variance[j, 1]
            at = count
            while at > start[k] and offset[at - 1, 0] > dx:
                offset[at], spread[at], level[at] = offset[at - 1], spread[at - 1], level[at - 1]
                at -= 1
            offset[at, 0] = dx
            offset[at, 1] = dy
            spread[at, 0] = sx
            spread[at, 1] = sy
            level[at] = (
                np.log((1.0 - prior.outlier_share) / prior.outlier_share)
                + np.log(np.pi * reach * reach)
                - LOG_TWO_PI
                - 0.5 * np.log(sx * sy)
                - 0.5 * (differ / SIZE_SIGMA) ** 2
            )
            count += 1
        start[k + 1] = count
    return _Pairs(start, offset[:count], spread[:count], level[:count])


@njit(cache=True)
def _grown(
    offset: NDArray, spread: NDArray, level: NDArray, room: int
) -> tuple[NDArray, NDArray, NDArray]:
    new_offset = np.empty((room, 2))
    new_spread = np.empty((room, 2))
    new_level = np.empty(room)
    new_offset[: len(offset)] = offset
    new_spread[: len(spread)] = spread
    new_level[: len(level)] = level
    return new_offset, new_spread, new_level


@njit(cache=True)
def _probability(log_odds: float) -> float:
    return 1.0 / (1.0 + np.exp(-log_odds)) if log_odds > -500.0 else 0.0


@njit(cache=True)
def _best(pairs: _Pairs, k: int, ux: float, uy: float) -> tuple[int, float]:
    """Pair of box k that explains a displacement best, and its ln likelihood ratio."""
    best = -1
    highest = -np.inf
    for e in range(pairs.start[k], pairs.start[k + 1]):
        rx = pairs.offset[e, 0] - ux
        ry = pairs.offset[e, 1] - uy
        value = pairs.level[e] - 0.5 * (
            rx * rx / pairs.variance[e, 0] + ry * ry / pairs.variance[e, 1]
        )
        if value > highest:
            best = e
            highest = value
    return best, highest


@njit(cache=True)
def _best_shift(pairs: _Pairs, precision: float, least_gain: float) -> NDArray:
    """The shift, of those that bring one box onto a detection, on which most boxes agree.

    Each box counts by how far its best pair beats an outlier, none below 0.
    """
    out = np.zeros(2)
    highest = 0.0
    bound = 0.0
    for k in range(len(pairs.start) - 1):
        highest += max(0.0, _best(pairs, k, 0.0, 0.0)[1])
        most = 0.0
        for e in range(pairs.start[k], pairs.start[k + 1]):
            most = max(most, pairs.level[e])
        bound += most
    if bound - highest < least_gain:
        return out
    total = len(pairs.level)
    tried = min(total, MOST_HYPOTHESES)
    for h in range(tried):
        e = h * total // tried
        ux, uy = pairs.offset[e, 0], pairs.offset[e, 1]
        value = -0.5 * precision * (ux * ux + uy * uy)
        for k in range(len(pairs.start) - 1):
            value += max(0.0, _best(pairs, k, ux, uy)[1])
        if value > highest:
            highest = value
            out[0] = ux
            out[1] = uy
    return out


@njit(cache=True)
def _displacement(
    mean: NDArray, i: int, centre: NDArray, theta: NDArray
) -> tuple[float, float, float, float]:
    """u of box i, and where it is from the centre."""
    x = mean[i, 0] - centre[0]
    y = mean[i, 1] - centre[1]
    ux = theta[0] + theta[2] * x - theta[3] * y
    uy = theta[1] + theta[2] * y + theta[3] * x
    return ux, uy, x, y


@njit(cache=True)
def _support(
    pairs: _Pairs, mean: NDArray, rows: NDArray, centre: NDArray, theta: NDArray
) -> tuple[float, float]:
    """ln likelihood of the boxes against 'all outliers', and how many agree."""
    total = 0.0
    agree = 0.0
    for k in range(len(rows)):
        ux, uy, _, _ = _displacement(mean, rows[k], centre, theta)
        e, value = _best(pairs, k, ux, uy)
        if e < 0:
            continue
        total += max(value, 0.0) + np.log1p(np.exp(-abs(value)))  # ln(1 + exp(value))
        agree += _probability(value)
    return total, agree


@njit(cache=True)
def _normal_equations(
    pairs: _Pairs,
    mean: NDArray,
    rows: NDArray,
    centre: NDArray,
    theta: NDArray,
    information: NDArray,
) -> NDArray:
    """Jᵀ W J, written into `information`, and Jᵀ W y."""
    information[:] = 0.0
    pull = np.zeros(PARAMETERS)
    row = np.zeros(PARAMETERS)
    for k in range(len(rows)):
        ux, uy, x, y = _displacement(mean, rows[k], centre, theta)
        e, value = _best(pairs, k, ux, uy)
        if e < 0:
            continue
        weight = _probability(value)
        for axis in range(2):
            row[0] = 1.0 - axis
            row[1] = axis
            row[2] = y if axis else x
            row[3] = x if axis else -y
            w = weight / pairs.variance[e, axis]
            for a in range(PARAMETERS):
                pull[a] += w * row[a] * pairs.offset[e, axis]
                for b in range(PARAMETERS):
                    information[a, b] += w * row[a] * row[b]
    return pull
