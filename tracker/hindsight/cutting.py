"""Cut pieces where the engine's decision is better taken anew, with both sides known."""

from __future__ import annotations

from bisect import bisect, insort

import numpy as np
from numpy.typing import NDArray

from tracker.hindsight.pieces import Pieces, Scans
from tracker.log.model import Floats

# Of the doubtful decisions of a track within so many seconds the closest call alone is cut: what
# lies between two cuts should be long enough to say where it goes.
APART_SECONDS = 1.0
EQUAL = 9  # digits to which two calls are equally close; then the earlier one is cut


def cut_in_doubt(pieces: Pieces, scans: Scans, cut_seconds: float, cut_margin: float) -> Pieces:
    """Pieces cut at gaps longer than `cut_seconds` and at decisions closer than `cut_margin`.

    Each keeps its track's id. Scans that are themselves further apart are no gap. A decision's
    margin shows in what it took from the track's identity confidence; those about a gap's missed
    detections count as well.
    """
    piece, time = pieces.of_detection, scans.time[pieces.scan]
    gap = (np.diff(time) > cut_seconds + 1e-9) & (np.diff(pieces.scan) > 1)
    taken = np.diff(pieces.log_confidence)
    close = taken < -np.log1p(np.exp(-cut_margin))
    close &= (np.diff(piece) == 0) & (cut_margin > 0.0)
    begins = np.ones(len(piece), np.bool_)
    begins[1:] = (np.diff(piece) != 0) | gap | _closest_calls(close, taken, piece[1:], time[1:])
    number = np.cumsum(begins) - 1
    return pieces.regrouped(number, pieces.identity[piece[begins]])


def _closest_calls(
    close: NDArray[np.bool_], taken: Floats, piece: NDArray[np.int64], time: Floats
) -> NDArray[np.bool_]:
    """Of the close decisions those that have no closer one nearby, the closest chosen first."""
    chosen = np.zeros(len(close), np.bool_)
    rows = np.flatnonzero(close)
    moments: dict[int, list[float]] = {}
    for row in rows[np.lexsort((rows, np.round(taken[rows], EQUAL)))].tolist():
        known = moments.setdefault(int(piece[row]), [])
        moment = float(time[row])
        at = bisect(known, moment)
        near = [*known[max(0, at - 1) : at + 1]]
        if all(abs(moment - other) > APART_SECONDS for other in near):
            insort(known, moment)
            chosen[row] = True
    return chosen
