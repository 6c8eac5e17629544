"""Identity counts: one track an object over the whole sequence (Ristani et al. 2016)."""

from __future__ import annotations

import numpy as np

from tracker.evaluation.couples import Couples
from tracker.kernels.matching import cheapest_matching
from tracker.log.model import Ints


def own_tracks(couples: Couples, shared: Ints, objects: int) -> tuple[Ints, int]:
    """The track of each object, so that the most rows agree.

    couples : sorted by object, then track.   shared : (C,) frames in which each couple is close
    enough.

    Returns (O,) tracks, -1 for none, and IDTP: the rows that agree. The matching is exact (sums
    are whole numbers); an object or a track may go without.
    """
    good = np.flatnonzero(shared > 0)
    track = couples.track[good]
    start = np.searchsorted(couples.object[good], np.arange(objects + 1))
    # Making a couple is worth as many rows as it shares: `most` minus what that falls short of.
    most = float(shared.max(initial=0)) + 1.0
    short = np.array(most - shared[good], np.float64)
    tracks = int(track.max(initial=-1)) + 1
    chosen, _ = cheapest_matching(start, track, short, tracks, most, -1.0)
    own_track = np.full(objects, -1, np.int64)
    found = chosen >= 0
    own_track[found] = track[chosen[found]]
    return own_track, int(shared[good][chosen[found]].sum())
