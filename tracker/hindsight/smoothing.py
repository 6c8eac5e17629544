"""Each piece filtered forward and smoothed backward over its own detections.

The filter is the engine's own model, called as the engine calls it, scan by scan for all pieces
that are alive; only the pairing is known beforehand. (In joint-probabilistic mode the engine's
own states differ: there a track took part of several detections.)
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Protocol, runtime_checkable

import numpy as np

from tracker.errors import KernelError, SettingsError
from tracker.hindsight.pieces import Pieces, Scans
from tracker.kernels.smooth import SMOOTH_OK, smooth_step
from tracker.log.model import Floats, Ints

# States held at a time: a state of a box takes 1.2 kB while it is smoothed.
BATCH_ROWS = 50_000


@runtime_checkable
class Smoothable(Protocol):
    """What smoothing needs of a motion model.

    Its states begin with the measured components, in the measurement's order; their rates, if it
    has them, come next. A new state knows of the measured components what the detection says, and
    of the others a prior that does not depend on these.
    """

    dimension: int
    states: int

    def measurement_variance(self, z: Floats, sigma: Floats | None) -> Floats: ...

    def predict(self, mean: Floats, covariance: Floats, step_seconds: float) -> None: ...

    def update(
        self, mean: Floats, covariance: Floats, pairing: Ints, z: Floats, variance: Floats
    ) -> None: ...

    def initiate(self, z: Floats, variance: Floats) -> tuple[Floats, Floats]: ...

    def transition(self, mean: Floats, step_seconds: float) -> Floats:
        """(n, s, s) F of states (n, s): for a model that is not linear, its Jacobian there."""
        ...


def smoothable(model: object) -> Smoothable:
    """The model, if it can smooth. Raises SettingsError if it cannot."""
    if not isinstance(model, Smoothable):
        raise SettingsError(
            f"the motion model '{type(model).__name__}' cannot look back yet; leave out --offline "
            "or choose constant velocity",
            setting="motion",
        )
    return model


@dataclass(frozen=True, slots=True, eq=False)
class Grid:
    """A row for each piece and scan from its first to its last detection, by (scan, piece).

    piece, scan : (R,).   detection : (R,) row of the log, -1 between detections.
    before : (R,) the piece's row one scan earlier, -1 at its start.
    offset : (scans spanned + 1,) first row of each scan, from scan number `origin` on.
    """

    piece: Ints
    scan: Ints
    detection: Ints
    before: Ints
    offset: Ints
    origin: int

    def __len__(self) -> int:
        return len(self.piece)


def spread_out(pieces: Pieces) -> Grid:
    """The grid of some pieces."""
    first, last = pieces.first, pieces.last
    length = last - first + 1
    begin = np.concatenate(([0], np.cumsum(length)))
    total = int(begin[-1])
    piece = np.repeat(np.arange(len(pieces)), length)
    scan = np.arange(total) - begin[piece] + first[piece]
    detection = np.full(total, -1, np.int64)
    of_detection = pieces.of_detection
    detection[begin[of_detection] + pieces.scan - first[of_detection]] = pieces.row
    order = np.argsort(scan, kind="stable")
    place = np.empty(total, np.int64)
    place[order] = np.arange(total)
    before = np.full(total, -1, np.int64)
    before[1:] = place[:-1]
    before[begin[:-1]] = -1
    origin = int(first.min()) if len(first) else 0
    scans = int(last.max()) - origin + 1 if len(last) else 0
    offset = np.searchsorted(scan[order], origin + np.arange(scans + 1))
    return Grid(piece[order], scan[order], detection[order], before[order], offset, origin)


@dataclass(frozen=True, slots=True, eq=False)
class States:
    """States along a grid: (R, s) means and (R, s, s) covariances."""

    mean: Floats
    covariance: Floats


def batches(pieces: Pieces, most_rows: int = BATCH_ROWS) -> Iterator[Ints]:
    """Numbers of pieces, in order of their start, so that a batch spans few rows and scans."""
    order = np.lexsort((pieces.identity, pieces.first))
    rows = np.cumsum((pieces.last - pieces.first + 1)[order])
    begin = 0
    while begin < len(order):
        done = rows[begin - 1] if begin else 0
        end = max(begin + 1, int(np.searchsorted(rows, done + most_rows, side="right")))
        yield order[begin:end]
        begin = end


def filter_forward(
    model: Smoothable, grid: Grid, scans: Scans, z: Floats, variance: Floats
) -> States:
    """The filtered state in each row of a grid.

    z, variance : the whole log's measurements and their variances.
    """
    mean = np.empty((len(grid), model.states))
    covariance = np.empty((len(grid), model.states, model.states))
    for k in range(len(grid.offset) - 1):
        low, high = int(grid.offset[k]), int(grid.offset[k + 1])
        if low == high:
            continue
        before = grid.before[low:high]
        detection = grid.detection[low:high]
        going = np.flatnonzero(before >= 0)
        if len(going):
            here = mean[before[going]]
            spread = covariance[before[going]]
            model.predict(here, spread, _step(scans, grid.origin + k - 1))
            model.update(here, spread, detection[going], z, variance)
            mean[low + going] = here
            covariance[low + going] = spread
        if len(going) < high - low:
            fresh = np.flatnonzero(before < 0)
            mean[low + fresh], covariance[low + fresh] = model.initiate(
                z[detection[fresh]], variance[detection[fresh]]
            )
    return States(mean, covariance)


def smooth_backward(model: Smoothable, grid: Grid, scans: Scans, states: States) -> None:
    """Turn filtered states into smoothed ones, in place.

    Raises KernelError if a predicted covariance is not positive definite.
    """
    mean, covariance = states.mean, states.covariance
    for k in range(len(grid.offset) - 2, 0, -1):
        low, high = int(grid.offset[k]), int(grid.offset[k + 1])
        later = low + np.flatnonzero(grid.before[low:high] >= 0)
        if not len(later):
            continue
        row = grid.before[later]
        step = _step(scans, grid.origin + k - 1)
        here, spread = mean[row], covariance[row]
        ahead, ahead_spread = here.copy(), spread.copy()
        transition = model.transition(here, step)
        model.predict(ahead, ahead_spread, step)
        status = smooth_step(
            here, spread, ahead, ahead_spread, transition, mean[later], covariance[later]
        )
        if status != SMOOTH_OK:
            raise KernelError(
                f"scan {scans.number[grid.origin + k]}: a predicted covariance is not positive "
                "definite"
            )
        mean[row] = here
        covariance[row] = spread


def _step(scans: Scans, k: int) -> float:
    """Seconds from scan k to the next."""
    return float(scans.time[k + 1] - scans.time[k])
