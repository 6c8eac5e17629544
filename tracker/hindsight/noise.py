"""Process noise measured on the log's own tracks, by how well they predict themselves.

The engine's noise must forgive whatever a frame may bring (a jerk of the camera, a poor box). To
bridge seconds the question is another: how far from its course is an object after half a second,
one, two? The tracks answer it where they were seen all along.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from msgspec.structs import replace

from tracker.hindsight.pieces import Pieces, Scans
from tracker.hindsight.smoothing import Smoothable, filter_forward, spread_out
from tracker.log.model import Floats, Ints, Kind
from tracker.motion import motion_model
from tracker.settings import Settings

HORIZONS = (0.5, 1.0, 2.0)  # seconds ahead
FACTORS = 2.0 ** np.arange(-6.0, 3.0)  # of the settings' noise
SETTLED = 5  # scans after which a filter has forgotten how it began
# With fewer predictions than this the settings' noise stays.
LEAST_PREDICTIONS = 200
MOST_PREDICTIONS = 20_000  # of each horizon are judged: evenly spread, enough for a noise level


def measured_noise(
    settings: Settings, kind: Kind, pieces: Pieces, scans: Scans, z: Floats, variance: Floats
) -> Settings:
    """Settings whose [motion] noise is the likeliest of some multiples, position and size apart.

    z, variance : (N, d) of the log in the common frame. The likelihood is that of positions (or
    sizes) at each horizon given all detections before, as independent normals.
    """
    names = {"acceleration_noise": [0, 1]}
    if kind is Kind.BOX:
        names["size_noise"] = [2, 3]
    for name, axes in names.items():
        base = getattr(settings.motion, name)
        choices = [
            replace(settings, motion=replace(settings.motion, **{name: base * factor}))
            for factor in FACTORS.tolist()
        ]
        judged = _Judge(pieces, scans, z, variance, axes)
        scores = [judged(motion_model(choice, kind)) for choice in choices]
        if base > 0.0 and np.isfinite(scores).all():
            settings = choices[int(np.argmax(scores))]
    return settings


class _Judge:
    """How likely later detections are under a model, -inf where too few tell."""

    def __init__(
        self, pieces: Pieces, scans: Scans, z: Floats, variance: Floats, axes: list[int]
    ) -> None:
        self._grid = spread_out(pieces)
        self._scans, self._z, self._variance, self._axes = scans, z, variance, axes
        age = self._grid.scan - pieces.first[self._grid.piece]
        self._settled = np.flatnonzero(age >= SETTLED)
        self._later = _finder(pieces, len(scans.time))
        self._pieces = pieces

    def __call__(self, model: Smoothable) -> float:
        grid, axes = self._grid, self._axes
        states = filter_forward(model, grid, self._scans, self._z, self._variance)
        step = float(np.median(np.diff(self._scans.time))) if len(self._scans.time) > 1 else 1.0
        total, count = 0.0, 0
        for seconds in HORIZONS:
            lag = max(1, round(seconds / step))
            row = self._settled[grid.scan[self._settled] + lag < len(self._scans.time)]
            target = self._later(grid.piece[row], grid.scan[row] + lag)
            row, target = row[target >= 0], target[target >= 0]
            if not len(row):
                continue
            some = slice(None, None, 1 + len(row) // MOST_PREDICTIONS)
            row, target = row[some], target[some]
            mean, covariance = states.mean[row], states.covariance[row]
            model.predict(mean, covariance, lag * step)
            spread = covariance[:, axes, axes] + self._variance[target][:, axes]
            error = self._z[target][:, axes] - mean[:, axes]
            total += float(np.mean(np.sum(error**2 / spread + np.log(spread), axis=1)))
            count += len(row)
        return -0.5 * total if count >= LEAST_PREDICTIONS else -np.inf


def _finder(pieces: Pieces, scans: int) -> Callable[[Ints, Ints], Ints]:
    """A function from (piece, scan) to the row of the log, -1 where there is no detection."""
    key = pieces.of_detection * scans + pieces.scan  # increases, as pieces are sorted

    def find(piece: Ints, scan: Ints) -> Ints:
        wanted = piece * scans + scan
        place = np.minimum(np.searchsorted(key, wanted), len(key) - 1)
        return np.where(key[place] == wanted, pieces.row[place], -1)

    return find
