"""Which frames a page holds: all where it matters, every so many elsewhere."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from tracker.log.model import Ints

ROWS_HELD = 300_000  # of tracks, detections, predictions and truth together: about 20 MB
WINDOW = 15  # frames on each side of an error or a contested moment


def frames_kept(
    frames: Ints, rows: Ints, errors: Ints, contested: Ints, budget: int = ROWS_HELD
) -> NDArray[np.bool_]:
    """Mask over `frames` (sorted, with so many rows each) of those that the page holds.

    Everything if it fits. Else the windows around errors, then around contested moments, in
    order of time until three quarters of the budget are used, and an even thinning of the rest.
    """
    if rows.sum() <= budget:
        return np.ones(len(frames), np.bool_)
    kept = np.zeros(len(frames), np.bool_)
    used = 0
    for moment in (*np.unique(errors).tolist(), *contested.tolist()):
        first, end = np.searchsorted(frames, (moment - WINDOW, moment + WINDOW + 1))
        new = np.flatnonzero(~kept[first:end]) + first
        cost = int(rows[new].sum())
        if used + cost > 0.75 * budget:
            continue
        kept[new] = True
        used += cost
    rest = np.flatnonzero(~kept)
    left = budget - used
    if len(rest):
        step = max(1, int(np.ceil(rows[rest].sum() / max(left, 1))))
        kept[rest[::step]] = True
    return kept
