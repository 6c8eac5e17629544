"""One frame's association: each tier in turn, over what the earlier ones left unpaired."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from tracker.association.cost import candidate_costs
from tracker.association.pairs import CandidatePairs
from tracker.association.rule import AssociationRule, miss_costs
from tracker.errors import CertificateError, InputError, KernelError
from tracker.kernels.assignment import Problem
from tracker.kernels.components import Components, label_components
from tracker.kernels.gate import GATE_NOT_POSITIVE, GATE_TOO_MANY, Candidates, gate_candidates
from tracker.kernels.solve import Solution, solve
from tracker.lifecycle.table import TrackTable
from tracker.log.model import Floats, Frame, Ints

# A proof may be off by rounding only: relative to the sum of absolute costs of its component.
PROOF_TOLERANCE = 1e-9


@dataclass(slots=True, eq=False)
class TierDecision:
    """What one tier saw and decided. Rows are tracks, columns are detections *of this tier*.

    selected_tracks, selected_detections : which took part, None for all; `track` and `detection`
    give the table rows and the numbers in the frame.
    terms : (T, E) cost terms, `problem.cost` is their sum plus −ln P_D.
    """

    tier: int
    rule: AssociationRule
    selected_tracks: Ints | None
    selected_detections: Ints | None
    candidates: Candidates
    terms: Floats
    problem: Problem
    solution: Solution

    @property
    def track(self) -> Ints:
        """(n,) table row of each row."""
        if self.selected_tracks is not None:
            return self.selected_tracks
        return _numbers(len(self.problem.miss))

    @property
    def components(self) -> Components:
        """Components of the candidate graph, found anew at each call."""
        return label_components(self.problem.start, self.problem.column, len(self.problem.new))

    @property
    def detection(self) -> Ints:
        """(m,) number in the frame of each column."""
        if self.selected_detections is not None:
            return self.selected_detections
        return _numbers(len(self.problem.new))


_first_numbers = np.arange(1024)


def _numbers(count: int) -> Ints:
    """0, 1, … count − 1, without making them anew in every frame."""
    return _first_numbers[:count] if count <= len(_first_numbers) else np.arange(count)


def associate(
    rules: tuple[AssociationRule, ...],
    table: TrackTable,
    frame: Frame,
    variance: Floats,
    coupled: bool,
    explain: bool,
    detected: Floats | None = None,
) -> tuple[tuple[TierDecision, ...], Ints]:
    """Decide a frame.

    coupled : whether the axes of the tracks' covariances may be correlated.
    explain : whether margins are measured.   detected : (n,) P_D of each track, None for that of
    the settings.

    Returns the tiers' decisions and the (n,) detection of each live track, -1 for none.
    Raises InputError for more candidates than the limit, CertificateError if a proof fails.
    """
    if len(rules) == 1 and rules[0].everything:
        decision = _decide(
            0, rules[0], table, frame, variance, None, None, coupled, explain, detected
        )
        return (decision,), decision.solution.answer.row_column
    pairing = np.full(len(table), -1, np.int64)
    decisions = []
    free = np.ones(len(frame), np.bool_)
    for k, rule in enumerate(rules):
        tracks = np.flatnonzero((pairing < 0) & ((rule.states >> table.state) & 1).astype(bool))
        detections = np.flatnonzero(free & scored_inside(frame.score, rule))
        decision = _decide(
            k, rule, table, frame, variance, tracks, detections, coupled, explain, detected
        )
        decisions.append(decision)
        column = decision.solution.answer.row_column
        pairing[tracks] = np.where(column >= 0, detections[column], -1) if len(detections) else -1
        free[pairing[pairing >= 0]] = False
    return tuple(decisions), pairing


def _evidence(
    frame: int, rule: AssociationRule, problem: Problem, solution: Solution
) -> dict[str, Any]:
    """The component whose proof failed, in plain values."""
    components = label_components(problem.start, problem.column, len(problem.new))
    rows = np.flatnonzero(components.of_row == solution.weakest)
    columns = np.flatnonzero(components.of_column == solution.weakest)
    row = np.repeat(np.arange(len(problem.miss)), np.diff(problem.start))
    inside = np.flatnonzero(np.isin(row, rows))
    answer = solution.answer
    return {
        "frame": frame,
        "tier": rule.name,
        "candidates": [
            [int(row[e]), int(problem.column[e]), float(problem.cost[e])] for e in inside
        ],
        "miss": {int(i): float(problem.miss[i]) for i in rows},
        "new": {int(j): float(problem.new[j]) for j in columns},
        "pairs": {int(i): int(answer.row_column[i]) for i in rows},
        "row_price": {int(i): float(answer.row_price[i]) for i in rows},
        "column_price": {int(j): float(answer.column_price[j]) for j in columns},
    }


def scored_inside(score: Floats, rule: AssociationRule) -> NDArray[np.bool_]:
    """Detections in the tier's range of scores; one without a score is as good as any."""
    known = np.where(np.isnan(score), np.inf, score)
    inside = known >= rule.score_from
    if np.isfinite(rule.score_below):
        inside &= known < rule.score_below
    return inside


def _decide(
    tier: int,
    rule: AssociationRule,
    table: TrackTable,
    frame: Frame,
    variance: Floats,
    tracks: Ints | None,
    detections: Ints | None,
    coupled: bool,
    explain: bool,
    detected: Floats | None,
) -> TierDecision:
    mean, covariance, z = table.mean, table.covariance, frame.z
    if tracks is not None and detected is not None:
        detected = detected[tracks]
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
        coupled,
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
    pairs = CandidatePairs(candidates, table, frame, tracks, detections)
    count = len(mean)
    own = None if detected is None else np.repeat(detected, np.diff(candidates.start))
    terms, cost = candidate_costs(rule, pairs, own)
    problem = Problem(
        candidates.start,
        candidates.column,
        cost,
        miss_costs(rule, np.full(count, rule.detected) if detected is None else detected),
        np.zeros(len(z)),
    )
    solution = solve(problem, explain)
    if not max(abs(solution.gap), solution.violation) <= PROOF_TOLERANCE:
        raise CertificateError(
            f"component {solution.weakest} of tier '{rule.name}' is not proved optimal",
            frame=frame.number,
            gap=solution.gap,
            violation=solution.violation,
            evidence=_evidence(frame.number, rule, problem, solution),
        )
    return TierDecision(
        tier,
        rule,
        tracks,
        detections,
        candidates,
        terms,
        problem,
        solution,
    )
