"""Pictures of what was measured, as PNG."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
from scipy.stats import chi2

from tracker.calibration.calibrate import Calibration
from tracker.calibration.detection import Share
from tracker.results.folder import atomic_file


def write_plots(found: Calibration, folder: Path) -> list[Path]:
    """Write the pictures there are data for; returns their paths.

    Raises OutputError where that cannot be written.
    """
    folder.mkdir(parents=True, exist_ok=True)
    pictures = {f"detection_{of}": [s for s in found.shares if s.of == of]
                for of in ("score", "size", "visibility")}  # fmt: skip
    written = [
        _save(folder / f"{name}.png", lambda axes, s=shares: _shares(axes, s))
        for name, shares in pictures.items()
        if shares
    ]
    if len(found.distances):
        written.append(_save(folder / "innovations.png", lambda axes: _innovations(axes, found)))
    if found.matched:
        written.append(_save(folder / "clutter.png", lambda axes: _clutter(axes, found)))
        scores = np.concatenate([m.log.score for m in found.matched])
        if np.isfinite(scores).any():
            written.append(_save(folder / "scores.png", lambda axes: _scores(axes, found)))
    return written


def _save(path: Path, draw: Any) -> Path:
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure

    figure = Figure(figsize=(6.4, 4.4), layout="constrained")
    FigureCanvasAgg(figure)
    draw(figure.add_subplot())
    with atomic_file(path) as working:
        figure.savefig(working, format="png", dpi=110, metadata={"Software": None})
    return path


def _shares(axes: Any, shares: list[Share]) -> None:
    middle = [0.5 * (s.low + s.high) for s in shares]
    value = np.array([s.value for s in shares])
    bounds = np.array([s.interval for s in shares]).T
    axes.errorbar(middle, value, np.abs(bounds - value), fmt="o-", capsize=3)
    of = shares[0].of
    axes.set(xlabel=of, ylim=(0, 1.02), ylabel="share")
    axes.set_title("True detections by score" if of == "score" else f"Detected objects by {of}")


def _innovations(axes: Any, found: Calibration) -> None:
    m = found.dimension
    high = float(chi2.ppf(0.999, m))
    edges = np.linspace(0.0, high, 41)
    weight = np.full(len(found.distances), 1.0 / (len(found.distances) * edges[1]))
    axes.hist(found.distances, edges, weights=weight, alpha=0.6, label="measured")
    x = np.linspace(0.01, high, 300)
    axes.plot(x, chi2.pdf(x, m), label=f"chi-square, {m} degrees of freedom")
    axes.set(xlabel="squared Mahalanobis distance", ylabel="density")
    axes.set_title("Innovations under the calibrated settings")
    axes.legend()


def _clutter(axes: Any, found: Calibration) -> None:
    z = np.concatenate([m.log.z[m.false, :2] for m in found.matched])
    if len(z):
        counts, x, y = np.histogram2d(z[:, 0], z[:, 1], 24)
        frames = sum(len(m.frames) for m in found.matched)
        mesh = axes.pcolormesh(x, y, counts.T / frames)
        axes.figure.colorbar(mesh, label="false detections a frame and cell")
    if found.matched[0].log.kind.dimension == 4:
        axes.invert_yaxis()
    axes.set(xlabel="x", ylabel="y", title="Clutter")


def _scores(axes: Any, found: Calibration) -> None:
    both = [np.concatenate([m.log.score[rows] for m, rows in part]) for part in (
        [(m, m.detection) for m in found.matched], [(m, m.false) for m in found.matched],
    )]  # fmt: skip
    both = [s[np.isfinite(s)] for s in both]
    axes.hist(both, 30, label=("true", "false"), histtype="step", linewidth=1.5)
    axes.set(xlabel="score", ylabel="detections", title="Scores of true and false detections")
    axes.legend()
