"""Cut pieces where the engine's decision is better taken anew, with both sides known."""

from __future__ import annotations

import numpy as np

from tracker.hindsight.pieces import Pieces, Scans


def cut_in_doubt(pieces: Pieces, scans: Scans, cut_seconds: float, cut_margin: float) -> Pieces:
    """Pieces cut at gaps longer than `cut_seconds` and at decisions closer than `cut_margin`.

    Each keeps its track's id. Scans that are themselves further apart are no gap. A decision's
    margin shows in what it took from the track's identity confidence; those about a gap's missed
    detections count as well.
    """
    piece = pieces.of_detection
    begins = np.ones(len(piece), np.bool_)
    seconds = np.diff(scans.time[pieces.scan])
    gap = (seconds > cut_seconds + 1e-9) & (np.diff(pieces.scan) > 1)
    close = np.diff(pieces.log_confidence) < -np.log1p(np.exp(-cut_margin))
    begins[1:] = (np.diff(piece) != 0) | gap | (close & (cut_margin > 0.0))
    number = np.cumsum(begins) - 1
    return pieces.regrouped(number, pieces.identity[piece[begins]])
