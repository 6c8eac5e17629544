"""Cut pieces where the engine's decision is better taken anew, with both sides known."""

from __future__ import annotations

import numpy as np

from tracker.hindsight.pieces import Pieces, Scans


def cut_at_gaps(pieces: Pieces, scans: Scans, cut_seconds: float) -> Pieces:
    """Pieces without a gap longer than `cut_seconds`, each under its track's id.

    Scans that are themselves further apart are no gap.
    """
    piece = pieces.of_detection
    begins = np.ones(len(piece), np.bool_)
    seconds = np.diff(scans.time[pieces.scan])
    gap = (seconds > cut_seconds + 1e-9) & (np.diff(pieces.scan) > 1)
    begins[1:] = (np.diff(piece) != 0) | gap
    number = np.cumsum(begins) - 1
    return pieces.regrouped(number, pieces.identity[piece[begins]])
