"""Pairs against the gate: by how much they are inside or outside, and what would admit them."""

from __future__ import annotations

import math

import numpy as np
from scipy.special import gammaincc

from tracker.association import AssociationRule
from tracker.diagnosis.contest import Rules
from tracker.diagnosis.explanation import RECOMPUTED, Gate, Outside
from tracker.diagnosis.frame_record import FrameRecord
from tracker.kernels.kalman import squared_mahalanobis
from tracker.kernels.overlap import box_overlap

# Pairs outside the gate that are worth naming: so many gate radii away, and so many.
NEAR_RADII = 3.0
NEAR_COUNT = 3


def gate_of(
    rule: AssociationRule,
    probability: float | None,
    distance: float,
    overlap: float | None,
    source: str,
) -> Gate:
    """Hold a pair's d² and IoU against a tier's gate.

    The tail probability of d² is that of the chi-square distribution with as many degrees of
    freedom as a detection has components.
    """
    finite = math.isfinite(rule.threshold)
    return Gate(
        distance=distance,
        distance_limit=rule.threshold if finite else None,
        gate_probability=probability if finite else None,
        tail_needed=float(gammaincc(0.5 * rule.dimension, 0.5 * distance)),
        overlap=overlap,
        overlap_floor=rule.overlap_floor,
        inside=bool(distance <= rule.threshold and (overlap or 0.0) >= rule.overlap_floor),
        source=source,
    )


def measure_gate(
    record: FrameRecord,
    rules: Rules,
    tier: int,
    probability: float | None,
    row: int,
    detection: int,
) -> Gate:
    """The same for a pair that the ledger does not have, from its prediction and detection."""
    rule = rules.tiers[tier]
    distance, _ = squared_mahalanobis(
        record.estimate,
        record.covariance,
        row,
        record.z,
        record.variance,
        detection,
        np.empty((rule.dimension + 2, rule.dimension)),
        rules.coupled,
    )
    overlap = box_overlap(record.estimate, row, record.z, detection) if rule.boxes else None
    return gate_of(rule, probability, distance, overlap, RECOMPUTED)


def nearest_outside(
    record: FrameRecord,
    rules: Rules,
    tier: int,
    probability: float | None,
    pairs: list[tuple[int, int]],
    *,
    at_least_one: bool,
) -> tuple[Outside, ...]:
    """The nearest of some (table row, detection) pairs that are outside the gate, by d²."""
    gates = [
        (measure_gate(record, rules, tier, probability, row, detection), row, detection)
        for row, detection in pairs
    ]
    gates.sort(key=lambda item: (item[0].distance, item[1], item[2]))
    limit = NEAR_RADII**2 * rules.tiers[tier].threshold
    near = [item for item in gates if item[0].distance <= limit][:NEAR_COUNT]
    if not near and at_least_one:
        near = gates[:1]
    return tuple(
        Outside(int(record.track[row]), detection, record.line_of(detection), gate)
        for gate, row, detection in near
    )
