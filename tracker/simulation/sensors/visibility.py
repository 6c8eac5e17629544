"""How much of each object the sensor can see, when nearer ones stand in between."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from tracker.log.model import Floats, Ints

CELLS = (10, 16)  # across and down: the share is known to 1/160


def visible_share(
    frame: Ints,
    boxes: Floats,
    depth: Floats,
    *,
    blockers: Floats | None = None,
    bounds: tuple[float, float, float, float] | None = None,
) -> Floats:
    """(n,) share of each box that is inside the view and not covered by a nearer one.

    Each box is cut into cells; a cell is hidden if its centre lies in a nearer box of the frame.

    Parameters
    ----------
    frame : (n,) sorted; only boxes of the same frame cover each other.
    boxes : (n, 4) left, top, width, height of what is seen.   depth : (n,) smaller is nearer.
    blockers : (n, 4) the part of each box that really covers; by default the box itself.
    bounds : left, top, right, bottom of the view; by default unlimited.
    """
    covering = boxes if blockers is None else blockers
    share = np.ones(len(boxes))
    starts = np.unique(frame, return_index=True)[1].tolist()
    for start, stop in pairwise([*starts, len(frame)]):
        rows = slice(start, stop)
        share[rows] = _one_frame(boxes[rows], covering[rows], depth[rows], bounds)
    return share


def _one_frame(
    boxes: Floats, covering: Floats, depth: Floats, bounds: tuple[float, float, float, float] | None
) -> Floats:
    x = boxes[:, :1] + boxes[:, 2:3] * ((np.arange(CELLS[0]) + 0.5) / CELLS[0])
    y = boxes[:, 1:2] + boxes[:, 3:4] * ((np.arange(CELLS[1]) + 0.5) / CELLS[1])
    seen = np.ones((len(boxes), *CELLS), bool)
    if bounds is not None:
        left, top, right, bottom = bounds
        seen &= ((x >= left) & (x < right))[:, :, None] & ((y >= top) & (y < bottom))[:, None, :]
    far, near = _covered_pairs(boxes, covering, depth)
    if len(far):
        low, high = covering[near, :2], covering[near, :2] + covering[near, 2:]
        in_x = (x[far] >= low[:, :1]) & (x[far] < high[:, :1])
        in_y = (y[far] >= low[:, 1:]) & (y[far] < high[:, 1:])
        hidden = in_x[:, :, None] & in_y[:, None, :]
        first = np.flatnonzero(np.diff(far, prepend=-1))
        seen[far[first]] &= ~np.logical_or.reduceat(hidden, first, axis=0)
    return seen.mean(axis=(1, 2))


def _covered_pairs(
    boxes: Floats, covering: Floats, depth: Floats
) -> tuple[NDArray[np.intp], NDArray[np.intp]]:
    """Pairs (far, near) of overlapping boxes, sorted by far."""
    low, high = boxes[:, None, :2], boxes[:, None, :2] + boxes[:, None, 2:]
    cover_low, cover_high = covering[None, :, :2], covering[None, :, :2] + covering[None, :, 2:]
    touch = ((low < cover_high) & (cover_low < high)).all(axis=-1)
    far, near = np.nonzero(touch & (depth[None, :] < depth[:, None]))
    return far, near
