"""Links made into chains, one object each, and what the object is called."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from tracker.hindsight.linking import Links
from tracker.hindsight.pieces import Pieces
from tracker.log.model import Floats


def join(pieces: Pieces, links: Links, born: int) -> Pieces:
    """One piece a chain of links, in order of id.

    A chain has the id of the engine's track that it begins with; where a track was cut and stays
    cut, only the first of its chains can have its id, and the others get new ids above `born`,
    the highest of the engine's.

    Identity confidence goes on along a chain: the engine's decisions within each piece, times the
    probability 1 / (1 + e^−margin) of each link.
    """
    before = np.full(len(pieces), -1, np.int64)
    linked = np.flatnonzero(links.following >= 0)
    before[links.following[linked]] = linked
    won = np.zeros(len(pieces))
    made = links.made
    # A link that is not in the optimum has the odds of its force cost against it.
    nats = np.where(links.chosen, links.margin, -links.force)[made]
    won[links.candidates.later[made]] = -np.logaddexp(0.0, -nats)

    own = _within(pieces)
    at_end = own[pieces.start[1:] - 1] if len(pieces) else own
    chain = np.full(len(pieces), -1, np.int64)
    brought = np.zeros(len(pieces))  # log confidence that each piece begins with
    names: list[int] = []
    taken: set[int] = set()
    for p in np.lexsort((pieces.identity, pieces.first)).tolist():
        b = int(before[p])
        if b >= 0:
            chain[p] = chain[b]
            brought[p] = brought[b] + at_end[b] + won[p]
            continue
        name = int(pieces.identity[p])
        if name in taken:
            born += 1
            name = born
        taken.add(name)
        chain[p] = len(names)
        names.append(name)
    identity, rank = np.unique(np.array(names, np.int64), return_inverse=True)
    of_detection = pieces.of_detection
    carried = replace(pieces, log_confidence=brought[of_detection] + own)
    return carried.regrouped(rank[chain[of_detection]], identity)


def _within(pieces: Pieces) -> Floats:
    """(N,) log confidence of the engine's decisions since each piece began.

    Where a piece begins at a cut, the engine's decision there is the one that is taken anew; at a
    track's birth nothing has been decided yet.
    """
    first = pieces.log_confidence[pieces.start[:-1]]
    return pieces.log_confidence - first[pieces.of_detection]
