"""A decision as a picture: what was expected, what was seen, who got what, and the runner-up."""

from __future__ import annotations

import math
import textwrap
from pathlib import Path
from typing import Any

import numpy as np

from tracker.diagnosis.explanation import DetectionView, Explanation, TrackView
from tracker.diagnosis.picture_labels import place_labels
from tracker.diagnosis.sketch import BEST, FAINT, INK, Sketch, drawn_decisions, extent
from tracker.diagnosis.story import briefs, headline, title
from tracker.errors import UsageError
from tracker.log.model import Floats
from tracker.results.folder import atomic_file

INCHES = (9.0, 4.0, 9.0)  # width of the figure, least and most height of the axes
DOTS_AN_INCH = 130
LINE_LENGTH = 108  # of the heading, in letters
HANG = " " * 6  # before what does not fit in a line
EXPECTED, CHOSEN, RUNNER_UP, ASKED = (0, (5, 3)), "-", (0, (1, 1.5)), (0, (6, 2, 1, 2))
STYLES: dict[str, tuple[Any, float]] = {
    "chosen": (CHOSEN, 2.6),
    "runner-up": (RUNNER_UP, 2.6),
    "asked about": (ASKED, 1.6),
}


def draw(told: Explanation, path: str | Path) -> None:
    """Write an explanation as a PNG picture, complete or not at all.

    Raises UsageError for a file name that is not a PNG's or an explanation with nothing to draw,
    OutputError where the file cannot be written.
    """
    path = Path(path)
    if path.suffix.lower() != ".png":
        raise UsageError(f"pictures are PNG files: name it {path.stem}.png (found {path.name})")
    if not told.detections and not any(view.position for view in told.tracks):
        raise UsageError(
            f"frame {told.frame} has nothing to draw here; name a track with --track or a "
            "detection with --detection"
        )
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure

    sketch = Sketch(told)
    heading = _heading(told)
    over, under = 0.3 + 0.18 * len(heading), 0.95  # inches for heading and legend
    full_width, least, most = INCHES
    wide = 0.89 * full_width
    low, high, tall = _fitted(*sketch.region(), wide, least, most)
    full = tall + over + under
    figure = Figure(figsize=(full_width, full), dpi=DOTS_AN_INCH)
    FigureCanvasAgg(figure)
    axes = figure.add_axes((0.08, under / full, 0.89, tall / full))
    axes.set_xlim(low[0], high[0])
    axes.set_ylim(*((high[1], low[1]) if sketch.boxes else (low[1], high[1])))
    axes.tick_params(labelsize=8)
    axes.set_xlabel("x", fontsize=9)
    axes.set_ylabel("y, downwards" if sketch.boxes else "y", fontsize=9)
    figure.text(0.08, 1.0 - 0.12 / full, "\n".join(heading), fontsize=9.5, va="top", ha="left")
    _paint(axes, sketch)
    figure.legend(
        handles=_legend(sketch),
        loc="lower center",
        ncols=3 if sketch.boxes else 4,
        fontsize=8.5,
        handlelength=3.2,
        frameon=False,
    )
    figure.canvas.draw()
    place_labels(figure, axes, list(sketch.labels(low, high)), sketch.occupied(axes))
    _write(figure, path)


def _paint(axes: Any, sketch: Sketch) -> None:
    """Draw everything but the labels."""
    for track, view in sketch.tracks.items():
        _paint_track(axes, sketch, view, sketch.colours.get(track, FAINT))
    for seen in sketch.detections.values():
        _paint_detection(axes, sketch, seen)
    for link in sketch.links:
        style, width = STYLES[link.style]
        (x0, y0), (x1, y1) = sketch.ends(link)
        axes.plot(
            [x0, x1],
            [y0, y1],
            linestyle=style,
            linewidth=width,
            color=sketch.colours.get(link.track, FAINT),
            zorder=6,
        )


def _paint_track(axes: Any, sketch: Sketch, view: TrackView, colour: str) -> None:
    from matplotlib.patches import Ellipse, Rectangle

    x, y = view.position["x"], view.position["y"]
    if sketch.boxes:
        left, top, right, bottom = extent(view.position)
        patch: Any = Rectangle((left, top), right - left, bottom - top)
    else:
        spread = sketch.gate_spread(view)
        values, vectors = np.linalg.eigh(spread)
        major, minor = 2.0 * np.sqrt(values[::-1])
        angle = math.degrees(math.atan2(vectors[1, 1], vectors[0, 1]))
        patch = Ellipse((x, y), major, minor, angle=angle)
    patch.set(fill=False, linestyle=EXPECTED, edgecolor=colour, linewidth=1.8, zorder=4)
    axes.add_patch(patch)
    axes.plot([x], [y], marker="+", markersize=11, markeredgewidth=2, color=colour, zorder=7)


def _paint_detection(axes: Any, sketch: Sketch, view: DetectionView) -> None:
    from matplotlib.patches import Rectangle

    colour = INK if view.detection in sketch.near_detections else FAINT
    if sketch.boxes:
        left, top, right, bottom = extent(view.position)
        axes.add_patch(
            Rectangle(
                (left, top),
                right - left,
                bottom - top,
                fill=False,
                edgecolor=colour,
                linewidth=1.1,
                zorder=3,
            )
        )
    axes.plot([view.position["x"]], [view.position["y"]], "o", markersize=5, color=colour, zorder=5)


def _fitted(
    low: Floats, high: Floats, wide: float, least: float, most: float
) -> tuple[Floats, Floats, float]:
    """Widen a region so that it fills axes of `wide` inches and a fit height, at equal scales."""
    span = high - low
    tall = float(min(max(wide * span[1] / span[0], least), most))
    scale = max(span[0] / wide, span[1] / tall)
    middle, half = 0.5 * (low + high), 0.5 * scale * np.array([wide, tall])
    return middle - half, middle + half, tall


def _heading(told: Explanation) -> list[str]:
    """Lines above the picture."""
    lines = [title(told)]
    drawn = drawn_decisions(told)
    if told.track is None and told.detection is None:
        left = len(told.decisions) + told.left_out - len(drawn)
        if left:
            lines.append(f"Drawn are the closest and what hangs together with it, {left} are not.")
        for text in briefs(told, drawn[:BEST]):
            lines += text.splitlines()
    else:
        for item in drawn:
            lines += headline(told, item).splitlines()
    for answer in told.why_not:
        pair = f"track {answer.track} and detection {answer.detection}"
        lines.append(f"Why not {pair}? {answer.reason[0].upper()}{answer.reason[1:]}.")
    return [
        part for line in lines for part in textwrap.wrap(line, LINE_LENGTH, subsequent_indent=HANG)
    ]


def _legend(sketch: Sketch) -> list[Any]:
    from matplotlib.lines import Line2D

    gate = "expected box of a track" if sketch.boxes else _gate_words(sketch)
    handles = [
        Line2D([], [], color=FAINT, linestyle=EXPECTED, linewidth=1.8, label=gate),
        Line2D([], [], color=INK, linewidth=1.1, label="detection")
        if sketch.boxes
        else Line2D([], [], color=INK, marker="o", markersize=5, linestyle="", label="detection"),
        Line2D([], [], color=FAINT, marker="+", markersize=11, markeredgewidth=2, linestyle="",
               label="expected position"),
    ]  # fmt: skip
    used = {link.style for link in sketch.links}
    for name, (style, width) in STYLES.items():
        if name in used:
            handles.append(
                Line2D([], [], color=FAINT, linestyle=style, linewidth=width, label=name)
            )
    return handles


def _gate_words(sketch: Sketch) -> str:
    limit = sketch.gate_limit()
    return f"gate, d² ≤ {limit:.4g}" if limit != 1.0 else "one standard deviation"


def _write(figure: Any, path: Path) -> None:
    with atomic_file(path) as working, working.open("wb") as file:
        figure.savefig(file, format="png", metadata={"Software": None})
