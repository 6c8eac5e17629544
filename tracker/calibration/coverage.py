"""Sigmas wide enough that the gate holds as many true detections as it says.

Detections err with heavy tails: boxes of half-hidden objects are cut short, errors last from frame
to frame, annotations jump. The likeliest normal noise is then that of the many small errors, and
the gate and the likelihood cost refuse the few large ones, each a lost identity. `gate.probability`
is the chance that the true detection is inside; where significantly fewer are, measurement noise
is widened until it is true. Wider measurement noise leaves less to process noise, which is fitted
again; both in turn until the gate holds.
"""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np

from tracker.association.rule import gate_threshold
from tracker.calibration import noise
from tracker.calibration.evidence import Evidence
from tracker.calibration.intervals import share_interval
from tracker.calibration.noise import Chains
from tracker.log.model import Kind
from tracker.settings import Settings

MOST = 8.0
STEPS = 9  # halvings: the factor to 0.5%
ROUNDS = 3


def hold_gate(
    chains: Sequence[Chains], settings: Settings, evidence: list[Evidence]
) -> tuple[Settings, list[Evidence]]:
    """Settings with wider measurement noise where it is needed, and what that rests on."""
    for _ in range(ROUNDS):
        wider, said = _widen(chains, settings, evidence)
        if wider is settings:
            break
        settings, again = noise.fit_noise(chains, wider, keep_sigmas=True)
        fitted = {item.setting: item for item in again}
        evidence = [fitted.get(item.setting, item) for item in said]
    return settings, evidence


def _widen(
    chains: Sequence[Chains], settings: Settings, evidence: list[Evidence]
) -> tuple[Settings, list[Evidence]]:
    """One round; the same settings if the gate holds."""
    inside = settings.gate.probability
    if inside is None or all(item.log.sigma is not None for item in chains):
        return settings, evidence
    names = ["measurement.position_sigma"]
    if chains[0].log.kind is Kind.BOX:
        names.append("measurement.size_sigma")
    if any(item.kept for item in evidence if item.setting in names):
        return settings, evidence
    gate = gate_threshold(inside, chains[0].log.kind.dimension)

    def widened(factor: float) -> Settings:
        values = {n: float(f"{noise.value_of(settings, n) * factor:.4g}") for n in names}
        return noise.set_values(settings, values)

    def outside(tried: Settings) -> float:
        return float(np.mean(noise.distances(chains, tried) >= gate))

    at_first = outside(settings)
    count = len(noise.distances(chains, settings))
    if share_interval(round(at_first * count), count)[0] <= 1.0 - inside:
        return settings, evidence
    low, high = 0.0, math.log(MOST)
    for _ in range(STEPS):
        middle = 0.5 * (low + high)
        if outside(widened(math.exp(middle))) > 1.0 - inside:
            low = middle
        else:
            high = middle
    factor = math.exp(high)
    wide = widened(factor)
    said = (
        f"likeliest noise widened, at last {factor:.2f} times: {at_first:.2%} of the true "
        f"detections were outside the {inside:.1%} gate"
    )
    return wide, [
        Evidence(e.setting, noise.value_of(wide, e.setting), e.count, said, None)
        if e.setting in names else e
        for e in evidence
    ]  # fmt: skip
