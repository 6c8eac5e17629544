"""One tier's settings turned into the numbers that the kernels take."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from scipy.special import gammaincinv

from tracker.association.terms import TERMS, known_terms, registered_costs
from tracker.errors import SettingsError
from tracker.log.model import Floats, Kind
from tracker.results.tracks import TrackState
from tracker.settings.schema import CostSettings, Settings, TierSettings

# IoU below which boxes are no candidates, unless set.
HARDLY_TOUCHING = 0.1
# Of new objects and false detections, unless set: per frame and box scale to the fourth.
BOX_NEW_DENSITY = 0.135


@dataclass(frozen=True, slots=True)
class AssociationRule:
    """What one tier does, in numbers.

    threshold : gate on d² (inf: none).   detected : P_D, unless a track has its own.
    inside : P_G, 1 without a d² gate.   states : bit k set if `TrackState` k takes part.
    """

    name: str
    boxes: bool
    dimension: int
    threshold: float
    overlap_floor: float
    candidate_limit: int
    terms: tuple[str, ...]
    cost: CostSettings
    log_new_density: float
    detected: float
    inside: float
    score_from: float
    score_below: float
    states: int
    everything: bool  # all tracks and detections take part, no selection needed


def miss_costs(rule: AssociationRule, detected: Floats) -> Floats:
    """(n,) a_i = −ln(1 − P_D P_G) of tracks with detection probabilities `detected`, in nats."""
    return -np.log1p(-detected * rule.inside)


def gate_threshold(probability: float, dimension: int) -> float:
    """Chi-square quantile: d² of the true detection is below it with that probability."""
    return float(2.0 * gammaincinv(0.5 * dimension, probability))


def association_rules(settings: Settings, kind: Kind) -> tuple[AssociationRule, ...]:
    """One rule a tier, in order.

    Raises SettingsError where a setting contradicts the kind of measurement or another setting.
    """
    return tuple(
        _rule(settings, tier, kind, f"tiers[{k}]") for k, tier in enumerate(settings.tiers)
    )


def _rule(settings: Settings, tier: TierSettings, kind: Kind, where: str) -> AssociationRule:
    gate = tier.gate or settings.gate
    cost = tier.cost or settings.cost
    gate_path = f"{where}.gate" if tier.gate else "gate"
    cost_path = f"{where}.cost" if tier.cost else "cost"
    boxes = kind is Kind.BOX
    density = cost.new_density or (BOX_NEW_DENSITY if boxes else None)
    terms = tuple(_resolve_term(term, density) for term in cost.terms)
    floor = gate.overlap_floor
    if floor is None:
        floor = HARDLY_TOUCHING if boxes else 0.0
    if floor > 0.0 and not boxes:
        raise SettingsError(
            "an overlap floor needs boxes, these are points; set it to 0",
            setting=f"{gate_path}.overlap_floor",
        )
    threshold = math.inf
    if gate.probability is not None:
        threshold = gate_threshold(gate.probability, kind.dimension)
    elif floor == 0.0:
        raise SettingsError(
            "there is no gate at all; set a probability"
            + (" or gate.overlap_floor" if boxes else ""),
            setting=f"{gate_path}.probability",
        )
    for term in terms:
        if term not in TERMS and term not in registered_costs():
            raise SettingsError(
                f"there is no cost term '{term}'; there are {', '.join(known_terms())}",
                setting=f"{cost_path}.terms",
            )
        if term in ("overlap", "generalised-overlap") and not boxes:
            raise SettingsError(
                f"'{term}' needs boxes, these are points; use 'mahalanobis' or 'likelihood'",
                setting=f"{cost_path}.terms",
            )
        if term == "mahalanobis" and gate.probability is None:
            raise SettingsError(
                "'mahalanobis' is measured against the d² gate, which is switched off",
                setting=f"{cost_path}.terms",
            )
    if "likelihood" in terms and density is None:
        raise SettingsError(
            "'likelihood' needs the density of new objects and clutter",
            setting=f"{cost_path}.new_density",
        )
    low = -math.inf if tier.score_from is None else tier.score_from
    high = math.inf if tier.score_below is None else tier.score_below
    states = sum(1 << TrackState[word.upper()] for word in set(tier.states))
    return AssociationRule(
        name=tier.name,
        boxes=boxes,
        dimension=kind.dimension,
        threshold=threshold,
        overlap_floor=floor,
        candidate_limit=gate.candidate_limit,
        terms=terms,
        cost=cost,
        log_new_density=math.log(density) if density else math.nan,
        detected=settings.sensor.detection_probability,
        inside=1.0 if gate.probability is None else gate.probability,
        score_from=low,
        score_below=high,
        states=states,
        everything=bool(states == 0b111 and np.isneginf(low) and np.isposinf(high)),
    )


def _resolve_term(term: str, new_density: float | None) -> str:
    if term != "auto":
        return term
    return "mahalanobis" if new_density is None else "likelihood"
