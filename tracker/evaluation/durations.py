"""How long things last: tracks, delays, gaps, and the time until an identity is found again."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tracker.kernels.clearmot import Scene
from tracker.log.model import Ints

# Each in annotated frames of the object (tracks: in frames that have a row of the track).
MEANINGS: Mapping[str, str] = {
    "track_frames": "length of each track",
    "frames_to_first_match": "frames of an object before its first pairing",
    "gap_frames": "unpaired stretches between pairings of an object",
    "identity_recovered_frames": "stretches without its own track, which it then found again",
    "identity_lost_frames": "stretches without its own track, to the end of the object",
}


@dataclass(frozen=True, slots=True, eq=False)
class Durations:
    """values : by the names of `MEANINGS`, one number for each case.

    An object's *own track* is the one that the identity metrics give it.
    """

    values: Mapping[str, Ints]

    @classmethod
    def none(cls) -> Durations:
        return cls({name: np.zeros(0, np.int64) for name in MEANINGS})

    def __add__(self, other: Durations) -> Durations:
        return Durations(
            {
                name: np.concatenate((values, other.values[name]))
                for name, values in self.values.items()
            }
        )

    def summary(self) -> dict[str, dict[str, float | int | None]]:
        """Count, mean, median, 90th percentile (linear) and largest of each."""
        return {name: _summary(values) for name, values in self.values.items()}


def measure_durations(scene: Scene, match: Ints, own_track: Ints, tracks: int) -> Durations:
    """Durations of one sequence.

    match : (T,) pair of each annotated row, -1 for none.   own_track : (O,) track of each object
    by the identity metrics, -1 for none.   tracks : how many there are.
    """
    order = np.argsort(scene.truth, kind="stable")
    thing = scene.truth[order]
    paired = match[order] >= 0
    track = np.full(len(order), -1, np.int64)
    track[paired] = scene.track[scene.pair_row[match[order][paired]]]
    before, between, _ = _stretches(thing, paired)
    _, recovered, lost = _stretches(thing, paired & (track == own_track[thing]))
    return Durations(
        {
            "track_frames": np.bincount(scene.track, minlength=tracks),
            "frames_to_first_match": before,
            "gap_frames": between,
            "identity_recovered_frames": recovered,
            "identity_lost_frames": lost[lost > 0],
        }
    )


def _stretches(thing: Ints, good: NDArray[np.bool_]) -> tuple[Ints, Ints, Ints]:
    """Lengths of what is not good, of objects that are good at least once.

    thing : (n,) object of each row, sorted by object, then time.

    Returns the lengths before the first good row (perhaps 0), between good rows (above 0), and
    after the last (perhaps 0).
    """
    at = np.flatnonzero(good)
    owner = thing[at]
    fresh = np.append(True, owner[1:] != owner[:-1]) if len(at) else np.zeros(0, np.bool_)
    ending = np.append(fresh[1:], True) if len(at) else fresh
    start = np.searchsorted(thing, owner[fresh], side="left")
    stop = np.searchsorted(thing, owner[ending], side="right")
    between = np.diff(at)[~fresh[1:]] - 1 if len(at) else np.zeros(0, np.int64)
    return at[fresh] - start, between[between > 0], stop - 1 - at[ending]


def _summary(values: Ints) -> dict[str, float | int | None]:
    if not len(values):
        return {"count": 0, "mean": None, "median": None, "p90": None, "largest": None}
    return {
        "count": len(values),
        "mean": float(values.mean()),
        "median": float(np.median(values)),
        "p90": float(np.quantile(values, 0.9)),
        "largest": int(values.max()),
    }
