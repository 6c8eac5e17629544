"""Where and how large tracks begin, as a density: the rival story of every link.

New tracks do not begin anywhere: they enter at borders and doors, and where objects are crowded
together or far away they come and go. Had a link to beat a beginning anywhere in view, it would
win too easily there.
"""

from __future__ import annotations

import math

import numpy as np

from tracker.hindsight.pieces import Pieces, Scans
from tracker.log.model import DetectionLog, Floats, Kind

# At most so many beginnings, evenly spread over the log, stand for all.
MOST_EXAMPLES = 1000
ROWS_AT_ONCE = 1000  # bounds memory


def in_view(log: DetectionLog) -> tuple[Floats, Floats]:
    """Corners of what the sensor sees: the image where its size is known, else all detections."""
    width, height = log.facts.image_width, log.facts.image_height
    if log.kind is Kind.BOX and width is not None and height is not None:
        return np.zeros(2), np.array([width, height])
    return log.z[:, :2].min(axis=0), log.z[:, :2].max(axis=0)


def log_density_of_beginnings(pieces: Pieces, log: DetectionLog, scans: Scans) -> Floats:
    """(P,) ln of new tracks per second and unit of measurement space, at each piece's beginning.

    A Gaussian kernel estimate from all other beginnings (positions, and logarithms of sizes) with
    the bandwidth of Silverman's rule (Silverman 1986, section 4.3; from memory), with one
    beginning's weight left for anywhere in view.
    """
    first = pieces.row[pieces.start[:-1]]
    count = max(1, int(np.sum(pieces.first > 0)))
    rate = math.log(count / (scans.time[-1] - scans.time[0]))
    low, high = in_view(log)
    extent = np.maximum(high - low, 1e-9 * np.maximum(1.0, np.abs(high)))
    place = (log.z[first, :2] - low) / extent
    level = np.full(len(first), -np.log(extent).sum())
    if log.kind is Kind.BOX:
        size = np.log(log.z[first][:, 2:4])
        level -= size.sum(axis=1)
        place = np.concatenate((place, size), axis=1)
    return rate + level + _leave_one_out(place)


def _leave_one_out(place: Floats) -> Floats:
    """(n,) ln density at each of (n, k) places estimated from the others."""
    n, k = place.shape
    step = -(-n // MOST_EXAMPLES)
    example = np.arange(0, n, step)
    m = len(example)
    # The broad part: a normal with the spread of all, never narrower than a tenth of the view.
    spread = np.cov(place.T) if n > k + 1 else np.zeros((k, k))
    spread = spread + 0.01 * np.eye(k)
    root = np.linalg.cholesky(np.linalg.inv(spread))
    white = (place - place.mean(axis=0)) @ root
    scale = math.log(abs(np.linalg.det(root)))
    broad = -0.5 * (white**2).sum(axis=1) - 0.5 * k * math.log(2.0 * math.pi)
    width = (4.0 / ((k + 2) * max(m, 1))) ** (1.0 / (k + 4))
    found = np.empty(n)
    for begin in range(0, n, ROWS_AT_ONCE):
        rows = slice(begin, min(n, begin + ROWS_AT_ONCE))
        squares = ((white[rows, None, :] - white[example][None, :, :]) / width) ** 2
        weight = np.exp(-0.5 * squares.sum(axis=2))
        weight[np.arange(begin, rows.stop)[:, None] == example] = 0.0
        found[rows] = weight.sum(axis=1)
    found /= width**k * (2.0 * math.pi) ** (0.5 * k)
    return scale + np.log((found + np.exp(broad)) / (m + 1.0))
