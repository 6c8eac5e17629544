"""A common frame for positions of different scans: where things would be if the sensor stood still.

A sensor's motion moves all objects alike, which no model of a single object can predict. What
needs positions of different scans to be comparable (smoothing, linking) therefore works in a
common frame, and results go back to the scan's own.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tracker.hindsight.pieces import Pieces
from tracker.log.model import Floats, Ints

# So many pieces must be seen in both of two scans before what they have in common says anything.
LEAST_WITNESSES = 3
# Displacements within so many median absolute deviations agree: 2.5 standard deviations.
AGREEING = 2.5 * 1.4826


@dataclass(frozen=True, slots=True, eq=False)
class CommonFrame:
    """(S, 2, 3) for each scan the affine map [A | b] of its first two axes into the common frame.

    Sizes scale by √|det A|; other axes, and noise beyond its scale, are left alone.
    """

    maps: Floats

    @classmethod
    def still(cls, scans: int) -> CommonFrame:
        """The sensor stands still: every map is the identity."""
        maps = np.zeros((scans, 2, 3))
        maps[:, 0, 0] = maps[:, 1, 1] = 1.0
        return cls(maps)

    @classmethod
    def shifts(cls, shift: Floats) -> CommonFrame:
        """Maps that only add (S, 2) shifts."""
        frame = cls.still(len(shift))
        frame.maps[:, :, 2] = shift
        return frame

    @classmethod
    def of_steps(cls, steps: Floats) -> CommonFrame:
        """From (S, 2, 3) maps [A | b] of the scan before into each scan; the first is not used.

        This is how a motion that was estimated scan by scan, by whatever means, gets in here.
        """
        frame = cls.still(len(steps))
        for k in range(1, len(steps)):
            back = np.linalg.inv(steps[k, :, :2])
            turn = frame.maps[k - 1, :, :2] @ back
            frame.maps[k, :, :2] = turn
            frame.maps[k, :, 2] = frame.maps[k - 1, :, 2] - turn @ steps[k, :, 2]
        return frame

    def scale(self, scan: Ints) -> Floats:
        """(n,) by what lengths grow on the way to the common frame."""
        a = self.maps[scan]
        return np.sqrt(np.abs(a[:, 0, 0] * a[:, 1, 1] - a[:, 0, 1] * a[:, 1, 0]))

    def forth(self, z: Floats, scan: Ints) -> Floats:
        """(n, d) measurements of some scans in the common frame."""
        maps = self.maps[scan]
        out = z * self.scale(scan)[:, None]
        out[:, :2] = np.einsum("nij,nj->ni", maps[:, :, :2], z[:, :2]) + maps[:, :, 2]
        return out

    def back(
        self, estimate: Floats, rate: Floats, covariance: Floats, scan: Ints
    ) -> tuple[Floats, Floats, Floats]:
        """(n, d) estimates, their rates and (n, d, d) covariances in the scans' own frames.

        Rates stay those of a sensor that stands still, in the scan's own units and directions.
        """
        maps = self.maps[scan]
        d = estimate.shape[1]
        turn = np.zeros((len(scan), d, d))
        turn[:, np.arange(d), np.arange(d)] = (1.0 / self.scale(scan))[:, None]
        turn[:, :2, :2] = np.linalg.inv(maps[:, :, :2])
        shifted = estimate.copy()
        shifted[:, :2] -= maps[:, :, 2]
        return (
            np.einsum("nij,nj->ni", turn, shifted),
            np.einsum("nij,nj->ni", turn, rate),
            turn @ covariance @ turn.transpose(0, 2, 1),
        )


def measure_common_motion(pieces: Pieces, scans: int, z: Floats) -> CommonFrame:
    """The common frame in which most pieces stand still from each scan to the next.

    z : (N, d) of the log. Consensus about the median, which less than half of the objects cannot
    move, then refined; where all walk one way the common frame walks with them, which a model
    of constant velocity does not mind.
    """
    shift = np.zeros((scans, 2))
    together = np.flatnonzero((np.diff(pieces.of_detection) == 0) & (np.diff(pieces.scan) == 1))
    arrival = pieces.scan[together + 1]
    order = np.argsort(arrival, kind="stable")
    moved = (z[pieces.row[together + 1], :2] - z[pieces.row[together], :2])[order]
    bound = np.searchsorted(arrival[order], np.arange(scans + 1))
    for k in range(scans):
        if bound[k + 1] - bound[k] >= LEAST_WITNESSES:
            shift[k] = _agreed(moved[bound[k] : bound[k + 1]])
    return CommonFrame.shifts(-np.cumsum(shift, axis=0))


def _agreed(moved: Floats) -> Floats:
    """(2,) mean of the (k, 2) displacements that agree with their median.

    The mean of the same objects' displacements adds up over scans without adding up their noise,
    which a median's does not.
    """
    middle = np.median(moved, axis=0)
    off = np.abs(moved - middle)
    limit = AGREEING * np.median(off, axis=0)
    agree = (off <= limit).all(axis=1)
    return np.mean(moved[agree], axis=0) if agree.any() else middle
