"""One frame's association: each tier in turn, over what the earlier ones left unpaired."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tracker.association.cost import candidate_costs
from tracker.association.rule import AssociationRule
from tracker.errors import CertificateError, InputError, KernelError
from tracker.kernels.assignment import Problem
from tracker.kernels.gate import GATE_NOT_POSITIVE, GATE_TOO_MANY, Candidates, gate_candidates
from tracker.kernels.solve import Solution, solve, worst_proof
from tracker.lifecycle.table import TrackTable
from tracker.log.model import Floats, Frame, Ints

# A proof may be off by rounding only: relative to the sum of absolute costs of its component.
PROOF_TOLERANCE = 1e-9


@dataclass(frozen=True, slots=True, eq=False)
class TierDecision:
    """What one tier saw and decided. Rows are tracks, columns are detections *of this tier*.

    track : (n,) table rows that took part.   detection : (m,) detections that took part.
    terms : (T, E) cost terms, `problem.cost` is their sum plus −ln P_D.
    gap, violation : the worst component's, relative to its scale; about 0.
    """

    tier: int
    rule: AssociationRule
    track: Ints
    detection: Ints
    candidates: Candidates
    terms: Floats
    problem: Problem
    solution: Solution
    gap: float
    violation: float


def associate(
    rules: tuple[AssociationRule, ...],
    table: TrackTable,
    frame: Frame,
    variance: Floats,
    explain: bool,
) -> tuple[tuple[TierDecision, ...], Ints]:
    """Decide a frame.

    Returns the tiers' decisions and the (n,) detection of each live track, -1 for none.
    Raises InputError for more candidates than the limit, CertificateError if a proof fails.
    """
    pairing = np.full(len(table), -1, np.int64)
    decisions = []
    free = np.ones(len(frame), np.bool_)
    for k, rule in enumerate(rules):
        tracks = detections = None
        if not (rule.everything and k == 0):
            tracks = np.flatnonzero((pairing < 0) & ((rule.states >> table.state) & 1).astype(bool))
            score = np.where(np.isnan(frame.score), np.inf, frame.score)
            wanted = free & (score >= rule.score_from)
            if np.isfinite(rule.score_below):
                wanted &= score < rule.score_below
            detections = np.flatnonzero(wanted)
        decision = _decide(k, rule, table, frame, variance, tracks, detections, explain)
        decisions.append(decision)
        column = decision.solution.answer.row_column
        if tracks is None:
            pairing = column
        else:
            pairing[tracks] = np.where(column >= 0, decision.detection[column], -1)
        free[pairing[pairing >= 0]] = False
    return tuple(decisions), pairing


def _decide(
    tier: int,
    rule: AssociationRule,
    table: TrackTable,
    frame: Frame,
    variance: Floats,
    tracks: Ints | None,
    detections: Ints | None,
    explain: bool,
) -> TierDecision:
    mean, covariance, z = table.mean, table.covariance, frame.z
    if tracks is not None:
        mean, covariance = mean[tracks], covariance[tracks]
    if detections is not None:
        z, variance = z[detections], variance[detections]
    status, row, candidates = gate_candidates(
        mean,
        covariance,
        z,
        variance,
        rule.threshold,
        rule.overlap_floor,
        rule.boxes,
        rule.candidate_limit,
    )
    if status == GATE_TOO_MANY:
        raise InputError(
            f"frame {frame.number} has more than {rule.candidate_limit} candidate pairs "
            f"({len(z)} detections, {len(mean)} tracks)",
            remedy="Narrow the gate (gate.probability, gate.overlap_floor), check the noise "
            "settings, or raise gate.candidate_limit.",
        )
    if status == GATE_NOT_POSITIVE:
        raise KernelError(
            f"frame {frame.number}: the innovation covariance of track "
            f"{table.identity[row if tracks is None else tracks[row]]} is not positive definite"
        )
    terms, cost = candidate_costs(rule, candidates)
    problem = Problem(
        candidates.start,
        candidates.column,
        cost,
        np.full(len(mean), rule.miss),
        np.zeros(len(z)),
    )
    solution = solve(problem, explain)
    component, gap, violation = worst_proof(solution.certificate)
    if not max(abs(gap), violation) <= PROOF_TOLERANCE:
        raise CertificateError(
            f"component {component} of tier '{rule.name}' is not proved optimal",
            frame=frame.number,
            gap=gap,
            violation=violation,
        )
    return TierDecision(
        tier,
        rule,
        np.arange(len(mean)) if tracks is None else tracks,
        np.arange(len(z)) if detections is None else detections,
        candidates,
        terms,
        problem,
        solution,
        gap,
        violation,
    )
