"""GOSPA and OSPA: how far the set of tracks is from the set of objects, without identities."""

from __future__ import annotations

from dataclasses import astuple, dataclass, fields
from math import sqrt

import numpy as np

from tracker.kernels.clearmot import Scene
from tracker.kernels.gospa import set_pairs
from tracker.log.model import Floats


@dataclass(frozen=True, slots=True)
class SetDistances:
    """Sums over frames that have any row; those of several sequences are added.

    Order p = 2 and α = 2; the cut-off c is the threshold of the evaluation: the distance threshold
    of points, 1 − IoU threshold of boxes. Means over frames are of squares (Rahmathullah et al.
    2017), so that the parts of GOSPA add up to it.
    """

    frames: int = 0
    localisation: float = 0.0  # Σ d² of paired rows
    missed: float = 0.0  # c²/2 for every object without a track
    false: float = 0.0  # c²/2 for every track without an object
    ospa_square: float = 0.0  # Σ OSPA², which is the next two together
    ospa_localisation: float = 0.0
    ospa_cardinality: float = 0.0

    def __add__(self, other: SetDistances) -> SetDistances:
        return SetDistances(*(a + b for a, b in zip(astuple(self), astuple(other), strict=True)))

    def scores(self) -> dict[str, float | None]:
        """Root mean square over frames, and the mean squares that it is made of."""
        if not self.frames:
            return dict.fromkeys(NAMES)
        whole = self.localisation + self.missed + self.false
        n = self.frames
        return {
            "gospa": sqrt(whole / n),
            "gospa_localisation": self.localisation / n,
            "gospa_missed": self.missed / n,
            "gospa_false": self.false / n,
            "ospa": sqrt(self.ospa_square / n),
            "ospa_localisation": self.ospa_localisation / n,
            "ospa_cardinality": self.ospa_cardinality / n,
        }


NAMES = (
    "gospa", "gospa_localisation", "gospa_missed", "gospa_false",
    "ospa", "ospa_localisation", "ospa_cardinality",
)  # fmt: skip


def measure_sets(scene: Scene, cut_off: float) -> SetDistances:
    """Sum up one sequence; `scene` has no pair further apart than the cut-off.

    A cut-off of 0 (an IoU threshold of 1) leaves nothing to measure.
    """
    frames, *sums = sets_by_frame(scene, cut_off).sum(axis=0).tolist()
    return SetDistances(int(frames), *sums)


def sets_by_frame(scene: Scene, cut_off: float) -> Floats:
    """(F, 7) what each frame adds to the fields of `SetDistances`, in their order."""
    out = np.zeros((len(scene.truth_start) - 1, len(fields(SetDistances))))
    if cut_off <= 0.0:
        return out
    pairs, square = set_pairs(scene, cut_off)
    objects, tracks = np.diff(scene.truth_start), np.diff(scene.track_start)
    larger, smaller = np.maximum(objects, tracks), np.minimum(objects, tracks)
    some = larger > 0
    worth = cut_off**2
    # Unpaired rows of the smaller set are as good as paired at the cut-off.
    near = (square + worth * (smaller - pairs))[some] / larger[some]
    number = worth * (larger - smaller)[some] / larger[some]
    out[:, 0] = some
    out[:, 1] = square
    out[:, 2] = worth / 2 * (objects - pairs)
    out[:, 3] = worth / 2 * (tracks - pairs)
    out[some, 4] = near + number
    out[some, 5] = near
    out[some, 6] = number
    return out
