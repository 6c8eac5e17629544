"""Identity counts: one track an object over the whole sequence (Ristani et al. 2016)."""

from __future__ import annotations

import numpy as np
from scipy.sparse import csr_array
from scipy.sparse.csgraph import min_weight_full_bipartite_matching

from tracker.evaluation.couples import Couples
from tracker.log.model import Ints


def identity_matches(couples: Couples, shared: Ints, objects: int) -> int:
    """IDTP: the most rows that can agree if each object has one track and each track one object.

    shared : (C,) frames in which each couple of object and track is close enough.
    """
    good = shared > 0
    shared = shared[good]
    if not len(shared):
        return 0
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
    return int(objects * most - round(float(table[row, column].sum())))
