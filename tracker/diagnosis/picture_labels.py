"""Labels beside points of a picture, moved apart until they do not cover one another."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

import numpy as np

DIRECTIONS = 16
DISTANCES = (14.0, 26.0, 42.0, 62.0, 86.0, 114.0)  # points of 1/72 inch
GAP = 2.0  # pixels between labels


@dataclass(frozen=True, slots=True)
class Label:
    """A text that belongs to the point (x, y); it is put near it, best towards (dx, dy)."""

    text: str
    x: float
    y: float
    dx: float
    dy: float
    colour: str


def place_labels(figure: Any, axes: Any, labels: list[Label], taken: list[Any]) -> None:
    """Write labels where they cover little of each other and of what is `taken` already.

    taken : boxes in pixels (left, bottom, right, top).   Labels are placed in the order given,
    each at the best of fixed places around its point, so the picture is always the same.
    """
    renderer = figure.canvas.get_renderer()
    frame = axes.get_window_extent(renderer)
    scale = figure.dpi / 72.0
    occupied = [np.asarray(box, float) for box in taken]
    for label in labels:
        note = axes.annotate(
            label.text,
            (label.x, label.y),
            xytext=(0.0, 0.0),
            textcoords="offset points",
            ha="center",
            va="center",
            fontsize=8.5,
            zorder=10,
            bbox={
                "boxstyle": "round,pad=0.25",
                "facecolor": "white",
                "edgecolor": label.colour,
                "linewidth": 1.0,
                "alpha": 0.92,
            },
            arrowprops={
                "arrowstyle": "-",
                "color": label.colour,
                "linewidth": 0.8,
                "shrinkA": 0.0,
                "shrinkB": 2.0,
            },
        )
        extent = note.get_bbox_patch().get_window_extent(renderer)
        half = 0.5 * np.array([extent.width, extent.height])
        anchor = axes.transData.transform((label.x, label.y))
        best = math.inf
        chosen = (0.0, 0.0)
        where = np.zeros(4)
        for offset in _offsets(label, half / scale):
            centre = anchor + np.array(offset) * scale
            box = np.concatenate((centre - half - GAP, centre + half + GAP))
            worse = _covered(box, occupied) + 3.0 * _beyond(box, frame)
            worse += 0.02 * half[1] * math.hypot(*offset) * scale  # near is good
            if worse < best:
                best, chosen, where = worse, offset, box
        note.set_position(chosen)
        occupied.append(where)


def _offsets(label: Label, half: Any) -> list[tuple[float, float]]:
    """Offsets in points, preferred direction and small distances first."""
    preferred = math.atan2(label.dy, label.dx)
    found = []
    for distance in DISTANCES:
        for k in range(DIRECTIONS):
            turn = (k + 1) // 2 * (1 if k % 2 else -1) * 2.0 * math.pi / DIRECTIONS
            angle = preferred + turn
            # Wide labels go further to the side than up, so that the point stays uncovered.
            found.append(
                (
                    math.cos(angle) * (distance + half[0]),
                    math.sin(angle) * (distance + half[1]),
                )
            )
    return found


def _covered(box: Any, occupied: list[Any]) -> float:
    """Area in pixels that a box shares with others."""
    if not occupied:
        return 0.0
    others = np.stack(occupied)
    width = np.minimum(box[2], others[:, 2]) - np.maximum(box[0], others[:, 0])
    height = np.minimum(box[3], others[:, 3]) - np.maximum(box[1], others[:, 1])
    return float((np.clip(width, 0, None) * np.clip(height, 0, None)).sum())


def _beyond(box: Any, frame: Any) -> float:
    """Area in pixels of a box that is outside the axes."""
    width = min(box[2], frame.x1) - max(box[0], frame.x0)
    height = min(box[3], frame.y1) - max(box[1], frame.y0)
    whole = (box[2] - box[0]) * (box[3] - box[1])
    return float(whole - max(width, 0.0) * max(height, 0.0))
