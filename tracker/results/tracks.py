"""Tracks as columns: what a run produced, or what a track file says."""

from __future__ import annotations

from dataclasses import dataclass
from enum import IntEnum

import numpy as np
from numpy.typing import NDArray

from tracker.log.model import Codes, Floats, Ints, Kind, SequenceFacts

# Files of a run folder, without their endings.
TRACKS = "tracks"
# In a run that looked back: the engine's own tracks, of which the ledger speaks.
TRACKS_ONLINE = "tracks_online"


class TrackState(IntEnum):
    """Lifecycle state of a track in one frame; the value is the code in arrays and kernels."""

    TENTATIVE = 0
    CONFIRMED = 1
    COASTING = 2
    ENDED = 3

    @property
    def word(self) -> str:
        return self.name.lower()


@dataclass(frozen=True, slots=True, eq=False)
class Tracks:
    """One row a track and frame, sorted by (frame, track).

    z : (n, d) in filter order (see `tracker.log.model`), the state estimate in measurement space.
    state : (n,) `TrackState` codes.   reported : (n,) whether the row counts as output.
    line : (n,) source line of the paired detection, -1 when coasting or unknown.
    """

    name: str
    kind: Kind
    facts: SequenceFacts
    frame: Ints
    time: Floats
    track: Ints
    z: Floats
    score: Floats
    label: Codes
    labels: tuple[str, ...]
    state: NDArray[np.int8]
    reported: NDArray[np.bool_]
    line: Ints

    def __len__(self) -> int:
        return len(self.z)
