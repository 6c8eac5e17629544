"""Identities from the engine's own confident tracks, where there is no truth."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
from scipy.optimize import brentq
from scipy.stats import chi2

from tracker.association.rule import gate_threshold
from tracker.calibration import noise
from tracker.calibration.evidence import FEWEST, Evidence
from tracker.calibration.intervals import share_interval
from tracker.calibration.noise import Chains
from tracker.errors import InputError
from tracker.log.model import DetectionLog
from tracker.offline import track_log
from tracker.results.tracks import Tracks
from tracker.settings import Settings

LEAST_ROWS = 5  # of a track to be trusted; common practice, no source


def own_chains(log: DetectionLog, settings: Settings) -> tuple[Chains, Evidence]:
    """Chains of reported tracks of five detections or more, and P_D within them.

    Raises InputError if there are none.
    """
    tracks = track_log(log, settings)
    seen = tracks.reported & (tracks.line >= 0)
    rows = np.bincount(tracks.track[seen], minlength=int(tracks.track.max(initial=0)) + 1)
    kept = np.flatnonzero(seen & (rows[tracks.track] >= LEAST_ROWS))
    if not len(kept):
        raise InputError(
            f"no track of '{log.name}' is long enough to learn from",
            path=log.path,
            remedy="Give --truth, or settings that track it with --settings.",
        )
    order = np.argsort(log.line, kind="stable")
    detection = order[np.searchsorted(log.line[order], tracks.line[kept])]
    position = np.searchsorted(log.frame_numbers, tracks.frame[kept])
    chains = noise.link(log, position, tracks.track[kept], detection, settings)
    return chains, _detected(tracks, kept, position)


def detected_share(parts: Sequence[Evidence]) -> Evidence:
    """P_D of several logs' tracks together."""
    trials = sum(item.count for item in parts)
    hits = round(sum(item.value * item.count for item in parts))
    value = min(max(hits / max(trials, 1), 0.01), 0.99)
    return Evidence(
        "sensor.detection_probability", value, trials,
        "detected share of frames inside confident tracks, gaps that end a track not counted: "
        "too high rather than too low", share_interval(hits, trials), kept=trials < FEWEST,
    )  # fmt: skip


def _detected(tracks: Tracks, kept: np.ndarray, position: np.ndarray) -> Evidence:
    """Share of the frames between a track's first and last detection in which it has one.

    First and last are detections by choice, and do not count.
    """
    hits = trials = 0
    for track in np.unique(tracks.track[kept]):
        at = position[tracks.track[kept] == track]
        hits += len(at) - 2
        trials += int(at.max() - at.min()) - 1
    return Evidence("", hits / max(trials, 1), trials, "")


def cut_off(chains: Sequence[Chains], settings: Settings) -> float:
    """Factor by which noise fitted to gated innovations is too small.

    The tracks hold only innovations with d² < γ, under the covariance S₀ the engine used. If the
    real one is c S₀, then E[d² | gate] = c m F_{m+2}(γ / c) / F_m(γ / c); this is solved for c,
    and the factor is the root of c over what the same mean says without a gate.
    """
    if settings.gate.probability is None:
        return 1.0
    m = chains[0].log.kind.dimension
    gate = gate_threshold(settings.gate.probability, m)
    d2 = noise.distances(chains, settings)
    d2 = d2[d2 < gate]
    mean = float(d2.mean()) if len(d2) else float(m)

    def gap(log_c: float) -> float:
        c = math.exp(log_c)
        return c * m * chi2.cdf(gate / c, m + 2) / chi2.cdf(gate / c, m) - mean

    low, high = math.log(1e-4), math.log(10.0)
    c = math.exp(brentq(gap, low, high)) if gap(low) * gap(high) < 0.0 else mean / m
    return math.sqrt(max(1.0, c * m / mean))


def widened(evidence: Sequence[Evidence], factor: float) -> list[Evidence]:
    """Noise levels times a factor, said in their methods."""
    out = []
    for item in evidence:
        if item.kept:
            out.append(item)
            continue
        interval = item.interval and (item.interval[0] * factor, item.interval[1] * factor)
        out.append(Evidence(
            item.setting, float(f"{item.value * factor:.4g}"), item.count,
            f"{item.method}; own confident tracks, times {factor:.4f} for what the gate cut off",
            interval,
        ))  # fmt: skip
    return out
