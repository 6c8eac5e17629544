"""The component that a decision was taken in, and what other answers would have cost.

Nothing is decided here. The chosen answer comes from the ledger; other answers are measured
against it by solving the same component once more with one pair imposed or one side left out.
Where the ledger kept only what was chosen, the candidates are found again from predictions and
detections by the rule of the tier, and the costs of the chosen pairs must come out as recorded.
"""

from __future__ import annotations

from dataclasses import dataclass

import msgspec
import numpy as np
from numpy.typing import NDArray

from tracker.association import AssociationRule, CandidatePairs
from tracker.association.cost import candidate_costs
from tracker.association.rule import association_rules, miss_costs
from tracker.association.terms import TERMS, registered_costs
from tracker.diagnosis.explanation import Change
from tracker.diagnosis.frame_record import FrameRecord
from tracker.errors import InputError
from tracker.kernels.assignment import Problem
from tracker.kernels.gate import GATE_OK, gate_candidates
from tracker.kernels.solve import solve
from tracker.lifecycle.table import TrackTable
from tracker.log.model import Codes, Floats, Frame, Ints, Kind
from tracker.settings.schema import CostSettings, Settings

# Terms that follow from what predictions.parquet and detections.parquet hold.
GEOMETRIC_TERMS = ("overlap", "generalised-overlap", "mahalanobis", "likelihood")

# Costs found again are the same operations on the same numbers; this allows for their order.
SAME_COST = 1e-9


@dataclass(frozen=True, slots=True)
class Rules:
    """The run's rule of each tier, and whether its costs can be worked out again."""

    tiers: tuple[AssociationRule, ...]
    repeatable: tuple[bool, ...]
    coupled: bool


def read_rules(settings: Settings, kind: Kind) -> Rules:
    """The rules of a run, also where it used cost functions that are not registered here."""

    def known(cost: CostSettings) -> CostSettings:
        terms = tuple(
            name for name in cost.terms if name in ("auto", *TERMS) or name in registered_costs()
        )
        return msgspec.structs.replace(cost, terms=terms or ("auto",))

    tiers = tuple(
        msgspec.structs.replace(tier, cost=known(tier.cost)) if tier.cost else tier
        for tier in settings.tiers
    )
    readable = msgspec.structs.replace(settings, cost=known(settings.cost), tiers=tiers)
    rules = association_rules(readable, kind)
    repeatable = tuple(
        set((tier.cost or settings.cost).terms) <= {"auto", *GEOMETRIC_TERMS}
        for tier in settings.tiers
    )
    return Rules(rules, repeatable, settings.association.mode == "joint-probabilistic")


@dataclass(frozen=True, slots=True, eq=False)
class Contest:
    """One component of one tier. Rows are `tracks`, columns `detections`, E candidates.

    row, column : (E,) of each candidate.   recorded : (E,) whether the ledger has it; the others
    were found again.   cost, terms, distance, overlap, force_cost : (E,); costs are nan where
    unknown, force costs where the ledger has none.   held : (n,) chosen column, -1 for none.
    miss : (n,) miss costs.
    problem : None if costs are unknown.
    """

    rule: AssociationRule
    tracks: Ints
    detections: Ints
    row: Ints
    column: Ints
    recorded: NDArray[np.bool_]
    cost: Floats
    terms: dict[str, Floats]
    distance: Floats
    overlap: Floats
    force_cost: Floats
    held: Ints
    miss: Floats
    problem: Problem | None

    def miss_of(self, track: int) -> float:
        """What it costs to miss a track, in nats."""
        return float(self.miss[np.searchsorted(self.tracks, track)])

    def candidates_of(self, *, track: int | None = None, detection: int | None = None) -> Ints:
        """Candidates of a track or of a detection, or of both."""
        wanted = np.ones(len(self.row), np.bool_)
        if track is not None:
            wanted &= self.tracks[self.row] == track
        if detection is not None:
            wanted &= self.detections[self.column] == detection
        return np.flatnonzero(wanted)

    def with_pair(self, e: int) -> tuple[float, Ints]:
        """Best answer that contains candidate e: how much worse, and what rows then hold."""
        i, j = self.row[e], self.column[e]
        held = self._best((self.row != i) & (self.column != j))
        held[i] = j
        return self._excess(held), held

    def without_track(self, track: int) -> tuple[float, Ints]:
        """Best answer in which a track is missed."""
        held = self._best(self.tracks[self.row] != track)
        return self._excess(held), held

    def without_detection(self, detection: int) -> tuple[float, Ints]:
        """Best answer in which a detection is left over."""
        held = self._best(self.detections[self.column] != detection)
        return self._excess(held), held

    def changes(self, held: Ints) -> tuple[Change, ...]:
        """How an answer differs from the chosen one, tracks first, then what is left over."""
        different = np.flatnonzero(held != self.held)
        found = [
            Change(int(self.tracks[i]), self._number(self.held[i]), self._number(held[i]))
            for i in different
        ]
        freed = set(self.held[self.held >= 0].tolist()) - set(held[held >= 0].tolist())
        return (*found, *(Change(None, self._number(j), None) for j in sorted(freed)))

    def _number(self, column: int) -> int | None:
        return int(self.detections[column]) if column >= 0 else None

    def _best(self, allowed: NDArray[np.bool_]) -> Ints:
        assert self.problem is not None
        counts = np.bincount(self.row[allowed], minlength=len(self.tracks))
        part = self.problem._replace(
            start=np.concatenate(([0], np.cumsum(counts))).astype(np.int64),
            column=self.column[allowed],
            cost=self.cost[allowed],
        )
        return solve(part, False).answer.row_column.copy()

    def _excess(self, held: Ints) -> float:
        """Cost of an answer minus the cost of the chosen one, over what differs."""
        different = np.flatnonzero(held != self.held)
        return max(0.0, self._total(held, different) - self._total(self.held, different))

    def _total(self, held: Ints, rows: Ints) -> float:
        """Cost of some rows; new costs are all 0."""
        assert self.problem is not None
        total = 0.0
        for i in rows:
            if held[i] < 0:
                total += self.problem.miss[i]
            else:
                e = np.flatnonzero((self.row == i) & (self.column == held[i]))
                total += self.cost[e[0]]
        return float(total)


def read_contest(
    record: FrameRecord, rules: Rules, tier: int, component: int, *, recorded: bool
) -> Contest:
    """Collect a component of a tier.

    recorded : whether the ledger has all of its candidates; else they are found again.
    """
    rows = record.decisions
    own = rows.where((rows.tier == tier) & (rows.component == component))
    tracks = np.unique(rows.track[own][rows.track[own] >= 0])
    detections = np.unique(rows.detection[own][rows.detection[own] >= 0])
    pairs = own[rows.decision[own] == "pair"]
    order = np.lexsort((rows.detection[pairs], rows.track[pairs]))
    pairs = pairs[order]
    held = np.full(len(tracks), -1, np.int64)
    chosen = pairs[rows.chosen[pairs]]
    held[np.searchsorted(tracks, rows.track[chosen])] = np.searchsorted(
        detections, rows.detection[chosen]
    )
    rule = rules.tiers[tier]
    if not recorded:
        return _found_again(record, rules, tier, tracks, detections, held, chosen)
    cost = rows.cost[pairs]
    row = np.searchsorted(tracks, rows.track[pairs])
    column = np.searchsorted(detections, rows.detection[pairs])
    miss = _miss(record, rule, tracks)
    return Contest(
        rule=rule,
        tracks=tracks,
        detections=detections,
        row=row,
        column=column,
        recorded=np.ones(len(pairs), np.bool_),
        cost=cost,
        terms={name: values[pairs] for name, values in rows.terms.items()},
        distance=rows.distance[pairs],
        overlap=rows.overlap[pairs],
        force_cost=np.where(rows.chosen[pairs], 0.0, rows.force_cost[pairs]),
        held=held,
        miss=miss,
        problem=_problem(row, column, cost, miss, len(detections)),
    )


def _found_again(
    record: FrameRecord,
    rules: Rules,
    tier: int,
    tracks: Ints,
    detections: Ints,
    held: Ints,
    chosen: Ints,
) -> Contest:
    """The component with its candidates gated again, and costed again where that can be done.

    chosen : rows of the chosen pairs. If their costs do not come out as recorded, the costs of the
    others are not believed.

    Raises InputError if they are not even candidates.
    """
    rule, rows = rules.tiers[tier], record.decisions
    at = np.searchsorted(record.track, tracks)
    estimate, covariance = record.estimate[at], record.covariance[at]
    z, variance = record.z[detections], record.variance[detections]
    status, _, candidates = gate_candidates(
        estimate,
        covariance,
        z,
        variance,
        rule.threshold,
        rule.overlap_floor,
        rule.boxes,
        rules.coupled,
        rule.candidate_limit,
    )
    assert status == GATE_OK, "the run gated these before"
    row = np.repeat(np.arange(len(tracks)), np.diff(candidates.start))
    column = candidates.column.copy()
    own = [
        np.flatnonzero((row == i) & (column == held[i]))
        for i in np.searchsorted(tracks, rows.track[chosen])
    ]
    if not all(map(len, own)):
        raise InputError(
            f"frame {record.number} has chosen pairs outside the gate that settings.toml sets",
            remedy="The files of the run folder do not belong together; associate again.",
        )
    mine = [int(found[0]) for found in own]
    cost = np.full(len(row), np.nan)
    terms = {name: np.full(len(row), np.nan) for name in rows.terms}
    if rules.repeatable[tier]:
        table = TrackTable(z.shape[1])
        table.append(estimate, covariance, np.full(len(tracks), np.nan), _codes(tracks), 0.0)
        frame = Frame(
            number=record.number,
            time=0.0,
            z=z,
            score=record.score[detections],
            label=_codes(detections),
            line=record.line[detections],
        )
        values, again = candidate_costs(
            rule,
            CandidatePairs(candidates, table, frame, None, None),
            record.detected[at][row],
        )
        if np.allclose(again[mine], rows.cost[chosen], rtol=SAME_COST, atol=SAME_COST):
            cost = again
            terms |= dict(zip(rule.terms, values, strict=True))
    known = not np.isnan(cost).any()
    miss = _miss(record, rule, tracks)
    recorded = np.zeros(len(row), np.bool_)
    recorded[mine] = True
    cost[mine] = rows.cost[chosen]
    for name in terms:
        terms[name][mine] = rows.terms[name][chosen]
    return Contest(
        rule=rule,
        tracks=tracks,
        detections=detections,
        row=row,
        column=column,
        recorded=recorded,
        cost=cost,
        terms=terms,
        distance=candidates.distance.copy(),
        overlap=candidates.overlap.copy(),
        force_cost=np.full(len(row), np.nan),
        held=held,
        miss=miss,
        problem=_problem(row, column, cost, miss, len(detections)) if known else None,
    )


def _codes(like: Ints) -> Codes:
    """As many unknown labels."""
    return np.full(len(like), -1, np.int32)


def _miss(record: FrameRecord, rule: AssociationRule, tracks: Ints) -> Floats:
    """What it costs to miss each track."""
    return miss_costs(rule, record.detected[np.searchsorted(record.track, tracks)])


def _problem(row: Ints, column: Ints, cost: Floats, miss: Floats, detections: int) -> Problem:
    counts = np.bincount(row, minlength=len(miss))
    return Problem(
        np.concatenate(([0], np.cumsum(counts))).astype(np.int64),
        np.ascontiguousarray(column),
        np.ascontiguousarray(cost),
        miss,
        np.zeros(detections),
    )
