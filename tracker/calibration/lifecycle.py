"""Coasting, confirmation and scores from matched detections."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
from scipy.stats import binom

from tracker.calibration.evidence import FEWEST, Evidence
from tracker.calibration.matching import Matched
from tracker.calibration.noise import Chains, innovations
from tracker.settings import Settings

GAP_QUANTILE = 0.95
LEAST_SCANS = 3.0
FALSE_CONFIRMS_A_FRAME = 0.02  # so many false tracks confirmed a frame at most; common practice
LARGEST_WINDOW = 8
CONFIRMED_SOON = 0.8  # common practice, no source


def coasting(found: Sequence[Matched]) -> Evidence:
    """Seconds after which hardly any gap in an object's detections ends, three scans at least.

    A track that ends loses its identity when the object is seen again, so the quantile is taken
    of gaps that are longer than a scan, and never shortens the default.
    """
    gaps, scans = [], []
    for item in found:
        time = item.log.frame_times
        scan = float(np.median(np.diff(time))) if len(time) > 1 else 0.0
        identity = item.truth.object[item.thing]
        order = np.lexsort((item.position, identity))
        same = np.diff(identity[order]) == 0
        gap = np.diff(time[item.position[order]])[same]
        gaps.append(gap[gap > 1.5 * scan])
        scans.append(scan)
    values = np.concatenate(gaps)
    scan = max(scans)
    least = LEAST_SCANS * scan
    count = len(values)
    high = float(np.quantile(values, GAP_QUANTILE)) if count >= FEWEST else 0.0
    default = Settings().lifecycle.coast_seconds
    value = float(f"{max(high, least, default) + 0.5 * scan * (least > default):.4g}")
    method = f"{GAP_QUANTILE:.0%} quantile of gaps, three scans and the default at least"
    return Evidence(
        "lifecycle.coast_seconds", value, count, method, kept=count < FEWEST and least <= default
    )


def confirmation(
    found: Sequence[Matched], chains: Sequence[Chains], settings: Settings, share: float
) -> list[Evidence]:
    """The smallest M of N that keeps false confirmations rare and confirms objects soon.

    share : P_D. False detections are independent from scan to scan here: a track born of clutter
    is confirmed if M − 1 of the next N − 1 scans have clutter inside its gate, binomially.
    """
    density = settings.cost.new_density
    frames = sum(len(item.frames) for item in found)
    false = sum(len(item.false) for item in found)
    names = ("lifecycle.confirm_hits", "lifecycle.confirm_window")
    if false < FEWEST or density is None:
        return [Evidence(name, None, false, "false detections", kept=True) for name in names]
    inside = 1.0 - math.exp(-_gate_volume(chains, settings, found) * density)
    a_frame = false / frames
    best = (settings.lifecycle.confirm_hits, settings.lifecycle.confirm_window)
    risk = _chance(*best, inside)
    for hits, window in _rules():
        if hits < best[0]:
            continue
        risk = _chance(hits, window, inside)
        if a_frame * risk <= FALSE_CONFIRMS_A_FRAME and _chance(hits, window, share) >= (
            CONFIRMED_SOON
        ):
            best = (hits, window)
            break
    else:
        risk = _chance(*best, inside)
    method = (
        f"clutter is in a new track's gate with probability {inside:.3g}: a false track is "
        f"confirmed with probability {risk:.2g}, an object with {_chance(*best, share):.2g}"
    )
    return [Evidence(name, value, false, method) for name, value in zip(names, best, strict=True)]


def _rules() -> list[tuple[int, int]]:
    return [(m, n) for m in range(2, 6) for n in range(m + 1, min(2 * m, LARGEST_WINDOW) + 1)]


def _chance(hits: int, window: int, probability: float) -> float:
    return float(binom.sf(hits - 2, window - 1, probability))


def _gate_volume(chains: Sequence[Chains], settings: Settings, found: Sequence[Matched]) -> float:
    """Median volume in which a detection is better explained by a track than as new."""
    from tracker.association.rule import gate_threshold

    boxes = found[0].log.kind.dimension == 4
    d = found[0].log.kind.dimension
    volumes = []
    for item in chains:
        _, s = innovations(item, settings)
        root = np.sqrt(s).prod(1)
        if boxes:
            z = item.log.z[item.detection]
            root = root / float(np.median(z[:, 2] * z[:, 3])) ** 2
        volumes.append(root)
    unit = math.pi if d == 2 else 0.5 * math.pi**2
    gate = gate_threshold(settings.gate.probability or 0.999, d)
    return unit * gate ** (0.5 * d) * float(np.median(np.concatenate(volumes)))


def birth_score(found: Sequence[Matched]) -> Evidence:
    """Score from which a detection starts a track, if scores separate true from false ones.

    The lowest score from which most detections are real, where those below mostly are not.
    """
    real = np.concatenate([m.log.score[m.detection] for m in found])
    false = np.concatenate([m.log.score[m.false] for m in found])
    name, count = "lifecycle.birth_score", min(len(real), len(false))
    if count < FEWEST or not (np.isfinite(real).all() and np.isfinite(false).all()):
        return Evidence(name, None, count, "scores of true and false detections", kept=True)
    values = np.concatenate([real, false])
    order = np.argsort(values)
    signed = np.concatenate([np.ones(len(real)), -np.ones(len(false))])[order]
    # Below the cut, as many more false than real ones as possible.
    excess = np.concatenate(([0.0], np.cumsum(-signed)))
    k = int(np.argmax(excess))
    if excess[k] < 0.25 * len(false) or k >= len(values):
        return Evidence(name, None, count, "scores do not separate true from false", kept=True)
    return Evidence(
        name, float(f"{values[order][k]:.4g}"), count,
        f"below it are {(false < values[order][k]).mean():.0%} of the false and "
        f"{(real < values[order][k]).mean():.0%} of the true detections",
    )  # fmt: skip
