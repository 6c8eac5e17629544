"""What predicts the log's own tracks best: how noisy motion is, and whether the sensor moved.

The engine's noise must forgive whatever a frame may bring (a jerk of the camera, a poor box). To
bridge seconds the question is another: how far from its course is an object after half a second,
one, two? The tracks answer it where they were seen all along.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from msgspec.structs import replace

from tracker.hindsight.pieces import Pieces, Scans
from tracker.hindsight.smoothing import Smoothable, filter_forward, smoothable, spread_out
from tracker.log.model import Floats, Ints, Kind
from tracker.motion import motion_model
from tracker.settings import Settings

HORIZONS = (0.5, 1.0, 2.0)  # seconds ahead
FACTORS = 2.0 ** np.arange(-6.0, 3.0)  # of the settings' noise
SETTLED = 5  # scans after which a filter has forgotten how it began
# With fewer predictions than this nothing is concluded.
LEAST_PREDICTIONS = 200
MOST_PREDICTIONS = 20_000  # of each horizon are judged
MOST_ROWS = 100_000  # are filtered: whole pieces, evenly spread, enough for a noise level
UNKNOWN = -np.inf


def likeliest_noise(
    settings: Settings, kind: Kind, pieces: Pieces, scans: Scans, z: Floats, variance: Floats
) -> tuple[Settings, float]:
    """Settings whose [motion] noise is the likeliest of some multiples, position and size apart.

    z, variance : (N, d) of the log in the common frame. The likelihood is that of positions (or
    sizes) at each horizon given all detections before, as independent normals.

    Returns also the log-likelihood of positions, a mean over predictions; -inf, and the settings
    as they were, where too few tell.
    """
    best = UNKNOWN
    names = {"acceleration_noise": [0, 1]}
    if kind is Kind.BOX:
        names["size_noise"] = [2, 3]
    for name, axes in names.items():
        base = getattr(settings.motion, name)
        judge = _Judge(pieces, scans, z, variance, axes)
        choices = [
            replace(settings, motion=replace(settings.motion, **{name: base * factor}))
            for factor in (FACTORS.tolist() if base > 0.0 else [1.0])
        ]
        scores = [judge(smoothable(motion_model(choice, kind))) for choice in choices]
        likeliest = int(np.argmax(scores))
        if scores[likeliest] > UNKNOWN:
            settings = choices[likeliest]
        if axes[0] == 0:
            best = scores[likeliest]
    return settings, best


def position_likelihood(
    settings: Settings, kind: Kind, pieces: Pieces, scans: Scans, z: Floats, variance: Floats
) -> float:
    """The same likelihood of positions under the settings' own noise."""
    judge = _Judge(pieces, scans, z, variance, [0, 1])
    return judge(smoothable(motion_model(settings, kind)))


class _Judge:
    """How likely later detections are under a model, -inf where too few tell."""

    def __init__(
        self, pieces: Pieces, scans: Scans, z: Floats, variance: Floats, axes: list[int]
    ) -> None:
        rows = int(np.sum(pieces.last - pieces.first + 1))
        pieces = pieces.only(np.arange(len(pieces)) % (1 + rows // MOST_ROWS) == 0)
        self._grid = spread_out(pieces)
        self._scans, self._z, self._variance, self._axes = scans, z, variance, axes
        age = self._grid.scan - pieces.first[self._grid.piece]
        self._settled = np.flatnonzero(age >= SETTLED)
        self._later = _finder(pieces, len(scans.time))

    def __call__(self, model: Smoothable) -> float:
        grid, axes, time = self._grid, self._axes, self._scans.time
        states = filter_forward(model, grid, self._scans, self._z, self._variance)
        step = float(np.median(np.diff(time))) if len(time) > 1 else 1.0
        total, count = 0.0, 0
        for lag in sorted({max(1, round(seconds / step)) for seconds in HORIZONS}):
            row = self._settled[grid.scan[self._settled] + lag < len(time)]
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
        return -0.5 * total if count >= LEAST_PREDICTIONS else UNKNOWN


def _finder(pieces: Pieces, scans: int) -> Callable[[Ints, Ints], Ints]:
    """A function from (piece, scan) to the row of the log, -1 where there is no detection."""
    key = pieces.of_detection * scans + pieces.scan  # increases, as pieces are sorted

    def find(piece: Ints, scan: Ints) -> Ints:
        wanted = piece * scans + scan
        place = np.minimum(np.searchsorted(key, wanted), len(key) - 1)
        return np.where(key[place] == wanted, pieces.row[place], -1)

    return find
