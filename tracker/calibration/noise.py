"""Measurement and process noise: maximum likelihood of innovations.

The annotated identities make the associations; the package's own filter runs over each object's
detections, and the parameters are those under which what it expected is likeliest (Schweppe 1965;
Bar-Shalom, Li and Kirubarajan 2001, ch. 5; from memory). That is the noise that a tracker meets:
annotation errors play no part, and gaps are predicted across as the engine does.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import msgspec
import numpy as np
from scipy.optimize import minimize

from tracker.association.rule import gate_threshold
from tracker.calibration.detection import scales
from tracker.calibration.evidence import FEWEST, Evidence
from tracker.calibration.intervals import sigma_interval
from tracker.calibration.matching import Matched
from tracker.engine import Engine
from tracker.log.model import DetectionLog, Floats, Ints, Kind
from tracker.motion.camera import CameraStep
from tracker.motion.constant_velocity import ConstantVelocity
from tracker.settings import Settings
from tracker.settings.files import settings_as_dict, settings_from

# A share of innovations is wild (annotation jumps, double detections): with this probability an
# innovation counts as ten times as wide, so that a few do not set the noise of all.
WILD_SHARE, WILD_WIDTH = 0.005, 10.0
LONGEST_GAP_SECONDS = 3.0
CONSISTENCY_GATE = 0.999
POSITION = (
    "motion.acceleration_noise",
    "measurement.position_sigma",
    "motion.initial_speed_sigma",
)
SIZE = ("motion.size_noise", "measurement.size_sigma", "motion.initial_size_rate_sigma")
BOUNDS = (math.log(1e-4), math.log(1e5))


@dataclass(frozen=True, slots=True, eq=False)
class Chains:
    """Detections of objects, in frames of one log: chain[i] is seen as detection[i] at position[i].

    A chain is one object up to a gap longer than three seconds. Sorted by position.
    """

    log: DetectionLog
    position: Ints
    chain: Ints
    detection: Ints
    camera: tuple[CameraStep | None, ...]

    def until(self, share: float, *, after: bool = False) -> Chains:
        """The part in the first `share` of the frames, or in the rest."""
        early = self.position < share * self.log.frame_count
        keep = ~early if after else early
        return replace(
            self, position=self.position[keep], chain=_by_birth(self.chain[keep]),
            detection=self.detection[keep],
        )  # fmt: skip


def chains_of(item: Matched, settings: Settings) -> Chains:
    """Chains of matched detections, and the camera's motion as the engine follows it."""
    return link(item.log, item.position, item.truth.object[item.thing], item.detection, settings)


def link(
    log: DetectionLog, position: Ints, identity: Ints, detection: Ints, settings: Settings
) -> Chains:
    """Chains of detections with identities; see `Chains`."""
    order = np.lexsort((position, identity))
    time = log.frame_times[position[order]]
    begins = np.ones(len(order), np.bool_)
    same = identity[order][1:] == identity[order][:-1]
    begins[1:] = ~same | (np.diff(time) > LONGEST_GAP_SECONDS + _scan(log) * 3)
    chain = np.empty(len(order), np.int64)
    chain[order] = np.cumsum(begins) - 1
    by_time = np.lexsort((chain, position))
    return Chains(
        log, position[by_time], _by_birth(chain[by_time]), detection[by_time],
        _camera_steps(log, settings),
    )  # fmt: skip


def _by_birth(chain: Ints) -> Ints:
    """Chains numbered by when they begin, so that those alive are close together."""
    _, first, dense = np.unique(chain, return_index=True, return_inverse=True)
    rank = np.empty(len(first), np.int64)
    rank[np.argsort(first)] = np.arange(len(first))
    return rank[dense]


def _scan(log: DetectionLog) -> float:
    return float(np.median(np.diff(log.frame_times))) if log.frame_count > 1 else 0.0


def _camera_steps(log: DetectionLog, settings: Settings) -> tuple[CameraStep | None, ...]:
    """What the engine finds the camera to do before each frame."""
    if log.kind is not Kind.BOX or settings.camera.motion == "still":
        return (None,) * log.frame_count
    engine = Engine(settings, log.kind, facts=log.facts, explain=False)
    return tuple(engine.step(frame).camera for frame in log.frames())


def innovations(chains: Chains, settings: Settings) -> tuple[Floats, Floats]:
    """(N, d) innovations z − H x⁻ and the diagonals of their S, without those that start a chain.

    Coasts are predicted across frame by frame, as in the engine.
    """
    log = chains.log
    model = ConstantVelocity(settings, log.kind)
    count = int(chains.chain.max()) + 1 if len(chains.chain) else 0
    d = log.kind.dimension
    mean, covariance = np.zeros((count, 2 * d)), np.zeros((count, 2 * d, 2 * d))
    last = np.zeros(count, np.int64)
    last[chains.chain] = chains.position  # sorted by position: the last stays
    oldest, born = 0, 0
    ys: list[Floats] = []
    ss: list[Floats] = []
    start = np.searchsorted(chains.position, np.arange(log.frame_count + 1))
    for k in range(log.frame_count):
        while oldest < born and last[oldest] < k:
            oldest += 1
        alive = slice(oldest, born)
        if born > oldest:
            step = float(log.frame_times[k] - log.frame_times[k - 1])
            model.predict(mean[alive], covariance[alive], step)
            moved = chains.camera[k]
            if moved is not None:
                moved.apply(_States(mean[alive], covariance[alive]), model.coupled)  # type: ignore[arg-type]
        rows = slice(start[k], start[k + 1])
        chain, detection = chains.chain[rows], chains.detection[rows]
        if not len(chain):
            continue
        z = log.z[detection]
        variance = model.measurement_variance(
            z, None if log.sigma is None else log.sigma[detection]
        )
        old = chain < born
        if old.any():
            known = chain[old]
            ys.append(z[old] - mean[known, :d])
            ss.append(np.diagonal(covariance[known], axis1=1, axis2=2)[:, :d] + variance[old])
            pairing = np.full(born - oldest, -1, np.int64)
            pairing[known - oldest] = np.flatnonzero(old)
            model.update(mean[alive], covariance[alive], pairing, z, variance)
        fresh = chain[~old]
        if len(fresh):
            mean[fresh], covariance[fresh] = model.initiate(z[~old], variance[~old])
            born = int(fresh.max()) + 1
    if not ys:
        return np.zeros((0, d)), np.zeros((0, d))
    return np.concatenate(ys), np.concatenate(ss)


@dataclass(frozen=True, slots=True, eq=False)
class _States:
    """As much of a track table as a camera step moves."""

    mean: Floats
    covariance: Floats


def loss(chains: Sequence[Chains], settings: Settings, axes: slice) -> float:
    """Minus the log-likelihood of the innovations on some axes, wild ones counted as such."""
    total = 0.0
    for item in chains:
        y, s = innovations(item, settings)
        y, s = y[:, axes], s[:, axes]
        d2 = (y * y / s).sum(1)
        n = y.shape[1]
        wild = math.log(WILD_SHARE) - n * math.log(WILD_WIDTH) - 0.5 * d2 / WILD_WIDTH**2
        plain = math.log1p(-WILD_SHARE) - 0.5 * d2
        total -= float((np.logaddexp(wild, plain) - 0.5 * np.log(s).sum(1)).sum())
    return total


def fit_noise(
    chains: Sequence[Chains], settings: Settings, *, keep_sigmas: bool = False
) -> tuple[Settings, list[Evidence]]:
    """Settings with the likeliest noise, and the evidence; few innovations leave them alone.

    keep_sigmas : leave the measurement noise as it is, as where the log has its own.
    """
    boxes = chains[0].log.kind is Kind.BOX
    given = keep_sigmas or all(item.log.sigma is not None for item in chains)
    groups: list[tuple[tuple[str, ...], slice]] = [(POSITION, slice(0, 2))] + (
        [(SIZE, slice(2, 4))] if boxes else []
    )
    evidence: list[Evidence] = []
    for names, axes in groups:
        if given:
            names = (names[0], names[2])
        count = sum(len(innovations(item, settings)[0]) for item in chains)
        if count < FEWEST:
            evidence += [
                Evidence(n, None, count, "innovations of objects", kept=True) for n in names
            ]
            continue
        settings, found = _fit(chains, settings, names, axes, count)
        evidence += found
    return settings, evidence


def _fit(
    chains: Sequence[Chains], settings: Settings, names: tuple[str, ...], axes: slice, count: int
) -> tuple[Settings, list[Evidence]]:
    start = np.log([max(value_of(settings, name), 1e-3) for name in names])
    if chains[0].log.kind is Kind.POINT:
        start += math.log(_first_guess(chains))

    def at(x: Floats) -> float:
        return loss(chains, _with(settings, names, x), axes)

    simplex = np.vstack([start, start + 0.7 * np.eye(len(start))])
    best = minimize(
        at, start, method="Nelder-Mead", bounds=[BOUNDS] * len(start),
        options={"initial_simplex": simplex, "xatol": 0.01, "fatol": 0.05, "maxfev": 150},
    ).x  # fmt: skip
    values = np.exp(best)
    intervals = [_profile(at, best, k) for k in range(len(best))]
    method = "maximum likelihood of innovations over objects' detections"
    found = [
        Evidence(name, float(f"{value:.4g}"), count, method, interval)
        for name, value, interval in zip(names, values, intervals, strict=True)
    ]
    return set_values(settings, {item.setting: item.value for item in found}), found


def _profile(at, best: Floats, k: int) -> tuple[float, float] | None:  # type: ignore[no-untyped-def]
    """Interval from the curvature of the likelihood along one logarithm, the others held."""
    h = 0.1
    step = np.zeros(len(best))
    step[k] = h
    curvature = (at(best + step) - 2.0 * at(best) + at(best - step)) / h**2
    if not curvature > 0.0:
        return None
    half = 1.96 / math.sqrt(curvature)
    return float(np.exp(best[k] - half)), float(np.exp(best[k] + half))


def _first_guess(chains: Sequence[Chains]) -> float:
    """Rough scale of points' units: the median step between detections of an object."""
    steps = []
    for item in chains:
        order = np.lexsort((item.position, item.chain))
        z, same = item.log.z[item.detection[order]], np.diff(item.chain[order]) == 0
        steps.append(np.abs(np.diff(z[:, :2], axis=0))[same].ravel())
    values = np.concatenate(steps)
    return max(float(np.median(values)), 1e-3) if len(values) else 1.0


def measurement_error(found: Sequence[Matched]) -> list[Evidence]:
    """Bias and robust sigma (1.4826 times the median absolute deviation) of detection minus truth.

    In box scales for boxes. Reported only: annotations have errors of their own.
    """
    boxes = found[0].log.kind is Kind.BOX
    parts = [m.residual / scales(m.truth.z[m.thing])[:, None] if boxes else m.residual
             for m in found]  # fmt: skip
    errors = np.concatenate(parts)
    out = []
    for name, axis in zip(("x", "y", "width", "height"), errors.T, strict=False):
        middle = float(np.median(axis))
        sigma = 1.4826 * float(np.median(np.abs(axis - middle)))
        n = len(axis)
        half = 1.96 * 1.2533 * sigma / math.sqrt(n)  # of a median of normal errors
        out.append(Evidence(f"bias_{name}", middle, n, "median of detection minus truth",
                            (middle - half, middle + half)))  # fmt: skip
        out.append(Evidence(f"sigma_{name}", sigma, n, "median absolute deviation",
                            sigma_interval(sigma, max(0.37 * n, 1.0))))  # fmt: skip
    return out


def consistency(chains: Sequence[Chains], settings: Settings) -> dict[str, float]:
    """Mean NIS inside the gate against its 95% bounds, and the share of innovations outside it.

    What the gate cuts off is corrected for: E[d² | d² < γ] = m F_{m+2}(γ) / F_m(γ).
    """
    from scipy.stats import chi2

    d2 = distances(chains, settings)
    m = chains[0].log.kind.dimension
    gate = gate_threshold(CONSISTENCY_GATE, m)
    inside = d2[d2 < gate]
    n = len(inside)
    expected = m * float(chi2.cdf(gate, m + 2) / chi2.cdf(gate, m))
    if not n:
        return {"count": 0, "mean": math.nan, "low": math.nan, "high": math.nan, "outside": 1.0}
    low, high = chi2.ppf([0.025, 0.975], m * n) / n * expected / m
    return {
        "count": n, "mean": float(inside.mean()), "low": float(low), "high": float(high),
        "outside": 1.0 - n / len(d2),
    }  # fmt: skip


def distances(chains: Sequence[Chains], settings: Settings) -> Floats:
    """(N,) d² of all innovations."""
    pairs = [innovations(item, settings) for item in chains]
    return np.concatenate([(y * y / s).sum(1) for y, s in pairs])


def value_of(settings: Settings, path: str) -> float:
    """The value of a setting given by its path."""
    section, name = path.split(".")
    return getattr(getattr(settings, section), name)


def set_values(settings: Settings, values: Mapping[str, object]) -> Settings:
    """Settings with some values replaced, checked."""
    plain = settings_as_dict(settings)
    for path, value in values.items():
        section, name = path.split(".")
        plain[section][name] = value
    return settings_from(plain)


def _with(settings: Settings, names: tuple[str, ...], x: Floats) -> Settings:
    for name, value in zip(names, np.exp(x), strict=True):
        section, field = name.split(".")
        part = msgspec.structs.replace(getattr(settings, section), **{field: float(value)})
        settings = msgspec.structs.replace(settings, **{section: part})
    return settings
