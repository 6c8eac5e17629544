"""Labels beside points of a picture, moved apart until they do not cover one another."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

DIRECTIONS = 16
DISTANCES = (8.0, 18.0, 32.0, 50.0, 72.0, 98.0, 130.0, 170.0)  # points of 1/72 inch
FONT_SIZE = 8.5
PADDING = 0.25  # of the font size, around the text
GAP = 2.0  # pixels between labels

# What a place costs, in pixels of covered area.
A_POINT_AWAY = 4.0
A_TURN = 250.0  # half a turn away from the preferred direction
STEP = 12.0  # pixels between the samples of a line …
THIN = 5.0  # … and half the size of the box that each stands for


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
    from matplotlib.text import Text

    renderer = figure.canvas.get_renderer()
    frame = axes.get_window_extent(renderer)
    scale = figure.dpi / 72.0
    occupied = [np.asarray(box, float) for box in taken]
    placed: list[NDArray] = []
    for label in labels:
        note = axes.annotate(
            label.text,
            (label.x, label.y),
            xytext=(0.0, 0.0),
            textcoords="offset points",
            ha="center",
            va="center",
            fontsize=FONT_SIZE,
            zorder=10,
            bbox={
                "boxstyle": f"round,pad={PADDING}",
                "facecolor": "white",
                "edgecolor": label.colour,
                "linewidth": 1.0,
                "alpha": 0.92,
            },
            arrowprops={
                "arrowstyle": "-",
                "color": label.colour,
                "linewidth": 0.9,
                "shrinkA": 0.0,
                "shrinkB": 1.0,
            },
        )
        extent = Text.get_window_extent(note, renderer)
        half = 0.5 * np.array([extent.width, extent.height]) + PADDING * FONT_SIZE * scale
        anchor = axes.transData.transform((label.x, label.y))
        best = math.inf
        chosen = (0.0, 0.0)
        where = np.zeros(4)
        for x, y, penalty in _places(label, half / scale):
            centre = anchor + np.array([x, y]) * scale
            box = np.concatenate((centre - half - GAP, centre + half + GAP))
            worse = penalty + _covered(box, occupied) + 3.0 * _beyond(box, frame)
            worse += sum(_covered(part, placed) for part in along(anchor, centre))
            if worse < best:
                best, chosen, where = worse, (x, y), box
        note.set_position(chosen)
        placed.append(where)
        occupied += [where, *along(anchor, 0.5 * (where[:2] + where[2:]))]


def along(one: NDArray, other: NDArray) -> list[NDArray]:
    """Small boxes in pixels along a line, so that labels keep off it."""
    steps = max(1, math.ceil(float(np.hypot(*(other - one))) / STEP))
    points = [one + (other - one) * k / steps for k in range(steps + 1)]
    return [np.concatenate((point - THIN, point + THIN)) for point in points]


def _places(label: Label, half: NDArray) -> list[tuple[float, float, float]]:
    """Offsets of a label's centre in points, and what each is worse than the preferred one.

    half : half width and height of the label in points; wide labels go further to the side than
    up, so that the point stays uncovered.
    """
    preferred = math.atan2(label.dy, label.dx)
    found = []
    for distance in DISTANCES:
        for k in range(DIRECTIONS):
            turn = (k + 1) // 2 * (1 if k % 2 else -1) * 2.0 * math.pi / DIRECTIONS
            x = math.cos(preferred + turn) * (distance + half[0])
            y = math.sin(preferred + turn) * (distance + half[1])
            penalty = A_POINT_AWAY * (distance - DISTANCES[0]) + A_TURN * abs(turn) / math.pi
            found.append((x, y, penalty))
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
