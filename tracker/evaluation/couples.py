"""Couples of an object and a track that ever come close."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tracker.evaluation.frames import SideBySide
from tracker.log.model import Ints

LARGEST_TABLE = 4_000_000  # objects times tracks


@dataclass(frozen=True, slots=True, eq=False)
class Couples:
    """of_pair : (E,) the couple of each pair.   object, track : (C,) its identities.
    object_rows, track_rows : (C,) how many rows those have.
    """

    of_pair: Ints
    object: Ints
    track: Ints
    object_rows: Ints
    track_rows: Ints

    def __len__(self) -> int:
        return len(self.object)


def find_couples(both: SideBySide) -> Couples:
    """Number the couples that have a pair."""
    scene = both.scene
    thing = np.repeat(scene.truth, np.diff(scene.pair_start))
    key, of_pair = _numbered(thing * both.tracks + scene.track[scene.pair_row], both)
    thing, track = np.divmod(key, both.tracks) if len(key) else (key, key)
    return Couples(
        of_pair.astype(np.int64),
        thing,
        track,
        np.bincount(scene.truth, minlength=both.objects)[thing],
        np.bincount(scene.track, minlength=both.tracks)[track],
    )


def _numbered(keys: Ints, both: SideBySide) -> tuple[Ints, Ints]:
    """The different keys in order, and the number of each; sorting only where no table fits."""
    size = both.objects * both.tracks
    if size > LARGEST_TABLE:
        return np.unique(keys, return_inverse=True)
    there = np.zeros(size, np.bool_)
    there[keys] = True
    return np.flatnonzero(there), (np.cumsum(there) - 1)[keys]
