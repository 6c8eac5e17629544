"""Identity counts: one track an object over the whole sequence (Ristani et al. 2016)."""

from __future__ import annotations

import numpy as np
from scipy.sparse import csr_array
from scipy.sparse.csgraph import min_weight_full_bipartite_matching

from tracker.evaluation.couples import Couples
from tracker.log.model import Ints


def own_tracks(couples: Couples, shared: Ints, objects: int) -> tuple[Ints, int]:
    """The track of each object, so that the most rows agree.

    shared : (C,) frames in which each couple of object and track is close enough.

    Returns (O,) tracks, -1 for none, and IDTP: the rows that agree.
    """
    own_track = np.full(objects, -1, np.int64)
    good = shared > 0
    shared = shared[good]
    if not len(shared):
        return own_track, 0
    # Every object may also go without a track, in a column of its own; weights are positive
    # because scipy's sparse solver drops zeros, and whole, so that sums are exact.
    most = int(shared.max()) + 1
    tracks = int(couples.track.max()) + 1
    own = np.arange(objects)
    weights = np.concatenate((most - shared, np.full(objects, most))).astype(np.float64)
    rows = np.concatenate((couples.object[good], own))
    columns = np.concatenate((couples.track[good], tracks + own))
    table = csr_array((weights, (rows, columns)), shape=(objects, tracks + objects))
    row, column = min_weight_full_bipartite_matching(table)
    found = column < tracks
    own_track[row[found]] = column[found]
    return own_track, int(objects * most - round(float(table[row, column].sum())))
