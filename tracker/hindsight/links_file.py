"""links.csv: every link that was weighed, and why it was made or not."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pyarrow as pa

from tracker.hindsight.look_back import Hindsight
from tracker.log.model import Ints
from tracker.results.table import missing_if_nan
from tracker.results.track_files import write_csv_chunk

LINKED, REJOINED = "linked", "joined again"  # two tracks, or the parts of one
DOUBTFUL, REFUSED = "too doubtful", "not linked"


def links_table(found: Hindsight) -> pa.Table:
    """One row a candidate, by (frame of the end, track, frame of the beginning).

    `earlier`, `later` are the engine's tracks, `object_before`, `object_after` what they are
    called in hindsight. `cost` stands against `end_cost`, that of no link. `margin` (of what is in
    the optimum) and `force_cost` (of what is not) are exact, in nats.
    """
    pieces, scans, links = found.pieces, found.scans, found.links
    if links is None:
        empty = np.empty(0, np.int64)
        earlier = later = empty
        gap = distance = cost = margin = force = end = np.empty(0)
        chosen = own = made = np.empty(0, np.bool_)
    else:
        weighed = links.candidates
        earlier, later = weighed.earlier, weighed.later
        gap, distance, cost = weighed.gap, weighed.distance, weighed.cost
        chosen, own, made = links.chosen, links.own, links.made
        margin, force = links.margin, links.force
        end = links.problem.miss[earlier]
    ends, begins = pieces.last[earlier], pieces.first[later]
    called = _names(found)
    order = np.lexsort((later, begins, earlier, ends))
    decision = np.where(chosen, DOUBTFUL, REFUSED).astype("U12")
    decision[made] = np.where(own, REJOINED, LINKED)[made]
    columns = {
        "earlier": pa.array(pieces.identity[earlier]),
        "later": pa.array(pieces.identity[later]),
        "last_frame": pa.array(scans.number[ends]),
        "first_frame": pa.array(scans.number[begins]),
        "gap_seconds": pa.array(np.round(gap, 6)),
        "distance": pa.array(np.round(distance, 4)),
        "cost": pa.array(np.round(cost, 4)),
        "end_cost": pa.array(np.round(end, 4)),
        "margin": missing_if_nan(np.round(margin, 4)),
        "force_cost": missing_if_nan(np.round(force, 4)),
        "decision": pa.array(decision.tolist(), pa.string()),
        "object_before": pa.array(called[earlier]),
        "object_after": pa.array(called[later]),
    }
    return pa.table(columns).take(pa.array(order))


def write_links(path: Path, found: Hindsight) -> None:
    """Write links.csv."""
    with path.open("wb") as file:
        write_csv_chunk(file, links_table(found), header=True)


def _names(found: Hindsight) -> Ints:
    """(P,) what each piece is called in hindsight: its first detection says it."""
    chains = found.chains
    by_row = np.zeros(int(chains.row.max()) + 1 if len(chains.row) else 0, np.int64)
    by_row[chains.row] = chains.identity[chains.of_detection]
    return by_row[found.pieces.row[found.pieces.start[:-1]]]
