"""Detection probability and clutter."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from scipy.spatial import ConvexHull, QhullError

from tracker.calibration.evidence import FEWEST, Evidence
from tracker.calibration.intervals import count_interval, share_interval
from tracker.calibration.matching import Matched
from tracker.log.model import Floats, Kind

POSITION_REACH, SIZE_REACH = 1.0, 0.5  # box scales: what counts as near an object
BOX_VOLUME = (2.0 * POSITION_REACH) ** 2 * (2.0 * SIZE_REACH) ** 2
BINS = 5


@dataclass(frozen=True, slots=True)
class Share:
    """Of `trials` objects (or detections) with `low` <= `of` < `high`, `successes` were real."""

    of: str
    low: float
    high: float
    successes: int
    trials: int

    @property
    def value(self) -> float:
        return self.successes / self.trials

    @property
    def interval(self) -> tuple[float, float]:
        return share_interval(self.successes, self.trials)


def detection_probability(found: Sequence[Matched]) -> Evidence:
    """P_D over all annotated rows in frames that the log has, with Wilson's interval."""
    hits = sum(len(item) for item in found)
    trials = hits + sum(len(item.missed) for item in found)
    value = min(max(hits / trials, 0.01), 0.99)
    return Evidence(
        "sensor.detection_probability", value, trials, "matched share of the truth, Wilson 1927",
        share_interval(hits, trials), kept=trials < FEWEST,
    )  # fmt: skip


def detection_shares(found: Sequence[Matched]) -> list[Share]:
    """P_D by size (square root of width times height) and visibility, and the share of true
    detections by score, in bins of about equal numbers; what the files do not say is left out.
    """
    hit = np.concatenate([np.repeat([True, False], (len(m), len(m.missed))) for m in found])
    rows = [np.concatenate([m.thing, m.missed]) for m in found]
    visible = np.concatenate([m.truth.visibility[r] for m, r in zip(found, rows, strict=True)])
    shares = _binned("visibility", visible, hit)
    if found[0].log.kind is Kind.BOX:
        size = [scales(m.truth.z[r]) for m, r in zip(found, rows, strict=True)]
        shares = _binned("size", np.concatenate(size), hit) + shares
    real = np.concatenate([np.repeat([True, False], (len(m), len(m.false))) for m in found])
    score = [m.log.score[np.concatenate([m.detection, m.false])] for m in found]
    return shares + _binned("score", np.concatenate(score), real)


def clutter_rate(found: Sequence[Matched]) -> Evidence:
    """False detections a frame, with the exact Poisson interval."""
    count, frames = sum(len(m.false) for m in found), sum(len(m.frames) for m in found)
    low, high = count_interval(count)
    return Evidence(
        "clutter_per_frame", count / frames, count, "false detections a frame, Garwood 1936",
        (low / frames, high / frames),
    )  # fmt: skip


def new_density(found: Sequence[Matched], reach: float | None) -> Evidence:
    """Density of false detections and of objects' first ones, as the likelihood cost needs it.

    Boxes: counted near annotated objects, in their box scales, where it matters to association.
    Points: within three distance thresholds of them, or over the hull of all detections where
    that gives too few.
    """
    count, volume = 0, 0.0
    boxes = found[0].log.kind is Kind.BOX
    for item in found:
        near, room = _near(item, 1.0 if boxes else 3.0 * (reach or 0.0))
        count, volume = count + near, volume + room
    method = "counted near objects, Garwood 1936"
    if count < FEWEST and not boxes:
        count = sum(len(m.false) + len(_first(m)) for m in found)
        volume = sum(len(m.frames) * _hull_area(m.log.z) for m in found)
        method = "counted in the hull of all detections, Garwood 1936"
    low, high = count_interval(count)
    if volume <= 0.0:
        return Evidence("cost.new_density", None, count, "no area to count in", kept=True)
    return Evidence(
        "cost.new_density", max(count, 1) / volume, count, method, (low / volume, high / volume),
        kept=count < FEWEST,
    )  # fmt: skip


def _near(item: Matched, reach: float) -> tuple[int, float]:
    """New detections near annotated rows, and the volume that was searched."""
    rows = np.concatenate([item.thing, item.missed])
    rows = rows[np.argsort(item.truth_position[rows], kind="stable")]
    new = np.sort(np.concatenate([item.false, _first(item)]))
    at = np.searchsorted(item.log.offsets, new, side="right") - 1
    boxes = item.log.kind is Kind.BOX
    count = 0
    for k in item.frames:
        a, b = np.searchsorted(item.truth_position[rows], (k, k + 1))
        c, d = np.searchsorted(at, (k, k + 1))
        if a == b or c == d:
            continue
        truth, z = item.truth.z[rows[a:b]], item.log.z[new[c:d]]
        apart = np.abs(z[None] - truth[:, None])
        if boxes:
            apart /= scales(truth)[:, None, None]
            inside = (apart < (POSITION_REACH,) * 2 + (SIZE_REACH,) * 2).all(2)
        else:
            inside = np.hypot(apart[..., 0], apart[..., 1]) < reach
        count += int(inside.sum())
    return count, len(rows) * (BOX_VOLUME if boxes else math.pi * reach * reach)


def _first(item: Matched) -> np.ndarray:
    """The first matched detection of each object: a new object to the tracker."""
    order = np.lexsort((item.position, item.truth.object[item.thing]))
    _, first = np.unique(item.truth.object[item.thing][order], return_index=True)
    first = order[first]
    return item.detection[first[item.position[first] > item.frames[0]]]


def scales(z: Floats) -> Floats:
    """(n,) box scales of (n, 4) boxes."""
    return np.sqrt(z[:, 2] * z[:, 3])


def _hull_area(z: Floats) -> float:
    try:
        return float(ConvexHull(z[:, :2]).volume)
    except (QhullError, ValueError):
        return 0.0


def _binned(name: str, values: Floats, real: np.ndarray) -> list[Share]:
    known = np.isfinite(values)
    values, real = values[known], real[known]
    if not len(values):
        return []
    edges = np.unique(np.quantile(values, np.linspace(0.0, 1.0, BINS + 1)))
    edges = np.append(edges[:-1], np.nextafter(edges[-1], np.inf))
    out = []
    for low, high in pairwise(edges):
        inside = (values >= low) & (values < high)
        if inside.any():
            out.append(
                Share(name, float(low), float(high), int(real[inside].sum()), int(inside.sum()))
            )
    return out
