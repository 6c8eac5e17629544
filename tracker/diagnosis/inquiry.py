"""One frame of a run, opened to be asked: its decisions with what else could have been decided."""

from __future__ import annotations

import math

import numpy as np

from tracker.diagnosis.contest import Contest, read_contest, read_rules
from tracker.diagnosis.explanation import (
    LEDGER,
    RECOMPUTED,
    Alternative,
    Change,
    Decision,
    Gate,
    Outside,
)
from tracker.diagnosis.frame_record import FrameRecord, read_frame
from tracker.diagnosis.gating import gate_of, measure_gate, nearest_outside
from tracker.diagnosis.history import Life, read_life
from tracker.diagnosis.ledger_reading import RunLedger
from tracker.diagnosis.words import odds
from tracker.log.model import Ints


class Inquiry:
    """Answers about one frame; what is read or measured is kept.

    Raises InputError if the run has no such frame.
    """

    def __init__(self, ledger: RunLedger, frame: int) -> None:
        self.ledger = ledger
        self.record: FrameRecord = read_frame(ledger, frame)
        self.rules = read_rules(ledger.settings, ledger.kind)
        self.limit = ledger.settings.ledger.contested_margin
        self._contests: dict[tuple[int, int], Contest] = {}
        self._lives: dict[int, Life] = {}

    def life(self, track: int) -> Life:
        """Birth, confirmation, end of a track."""
        if track not in self._lives:
            self._lives[track] = read_life(self.ledger, track)
        return self._lives[track]

    def gate_probability(self, tier: int) -> float | None:
        """P_G of a tier as set."""
        settings = self.ledger.settings
        return (settings.tiers[tier].gate or settings.gate).probability

    def rows_of(self, *, track: int | None = None, detection: int | None = None) -> Ints:
        """Chosen rows about a track or a detection, one a tier that it took part in."""
        rows = self.record.decisions
        own = rows.track == track if track is not None else rows.detection == detection
        found = np.flatnonzero(rows.chosen & own)
        return found[np.argsort(rows.tier[found], kind="stable")]

    def closest_rows(self, below: float = math.inf) -> Ints:
        """Chosen rows with a margin below some nats, smallest first."""
        rows = self.record.decisions
        close = np.flatnonzero(rows.chosen & (rows.margin < below))
        return close[np.lexsort((rows.detection[close], rows.track[close], rows.margin[close]))]

    def decision(self, r: int, *, by_detection: bool, with_outside: bool = True) -> Decision:
        """Explain chosen row r, seen from its detection or from its track."""
        rows = self.record.decisions
        tier = int(rows.tier[r])
        contest = self.contest(r)
        track = int(rows.track[r]) if rows.track[r] >= 0 else None
        detection = int(rows.detection[r]) if rows.detection[r] >= 0 else None
        margin = float(rows.margin[r])
        seen_from = (None, detection) if by_detection else (track, None)
        return Decision(
            decision=str(rows.decision[r]),
            tier=tier,
            tier_name=contest.rule.name,
            track=track,
            detection=detection,
            line=self.record.line_of(detection),
            margin=margin if math.isfinite(margin) else None,
            odds=odds(margin),
            contested=margin < self.limit,
            component_tracks=len(contest.tracks),
            component_detections=len(contest.detections),
            complete=contest.problem is not None,
            alternatives=self._alternatives(contest, tier, margin, *seen_from),
            outside=self._outside(contest, tier, *seen_from) if with_outside else (),
        )

    def contest(self, r: int) -> Contest:
        """The component that chosen row r belongs to."""
        rows = self.record.decisions
        key = (int(rows.tier[r]), int(rows.component[r]))
        if key not in self._contests:
            whole = self.ledger.level == "full" or bool(rows.contested[r])
            self._contests[key] = read_contest(self.record, self.rules, *key, recorded=whole)
        return self._contests[key]

    def pair(self, contest: Contest, tier: int, e: int, *, runner_up: bool = False) -> Alternative:
        """Candidate e of a component, with all that imposing it would have changed."""
        if contest.problem is None:
            return self._pair(contest, tier, e, self._forced(contest, e), False, ())
        changes = contest.changes(contest.with_pair(e)[1])
        return self._pair(contest, tier, e, self._forced(contest, e), runner_up, changes)

    def gate(self, tier: int, track: int, detection: int) -> Gate:
        """A live track and a detection against a tier's gate."""
        row = self.record.row_of(track)
        assert row is not None, "only live tracks were gated"
        probability = self.gate_probability(tier)
        return measure_gate(self.record, self.rules, tier, probability, row, detection)

    def _alternatives(
        self, contest: Contest, tier: int, margin: float, track: int | None, detection: int | None
    ) -> tuple[Alternative, ...]:
        """All that could have been decided about one of the two: chosen first, best next."""
        asked = contest.candidates_of(track=track, detection=detection).tolist()
        nats: list[float | None] = [self._forced(contest, e) for e in asked]
        chosen = [bool(contest.held[contest.row[e]] == contest.column[e]) for e in asked]
        nats.append(0.0 if not any(chosen) else self._left(contest, track, detection)[0])
        chosen.append(not any(chosen))
        order = sorted(range(len(nats)), key=lambda k: _rank(chosen[k], nats[k]))
        found = []
        for place, k in enumerate(order):
            # The best answer without the chosen decision is the best one with another.
            best = place == 1 and nats[k] is not None and math.isfinite(margin)
            if k == len(asked):
                item = self._unpaired(contest, track, detection, chosen[k], nats[k], best)
            elif best:
                item = self.pair(contest, tier, asked[k], runner_up=True)
            else:
                item = self._pair(contest, tier, asked[k], nats[k], False, ())
            found.append(item)
        return tuple(found)

    def _left(
        self, contest: Contest, track: int | None, detection: int | None
    ) -> tuple[float | None, tuple[Change, ...]]:
        """What it would have cost, and changed, to miss the track or leave the detection over."""
        if contest.problem is None:
            return None, ()
        if track is not None:
            nats, held = contest.without_track(track)
        else:
            assert detection is not None
            nats, held = contest.without_detection(detection)
        return nats, contest.changes(held)

    def _forced(self, contest: Contest, e: int) -> float | None:
        """Force cost of a candidate: the ledger's, else measured, None if costs are unknown."""
        if contest.held[contest.row[e]] == contest.column[e]:
            return 0.0
        if not math.isnan(contest.force_cost[e]):
            return float(contest.force_cost[e])
        return contest.with_pair(e)[0] if contest.problem is not None else None

    def _pair(
        self,
        contest: Contest,
        tier: int,
        e: int,
        force_cost: float | None,
        runner_up: bool,
        changes: tuple[Change, ...],
    ) -> Alternative:
        i, j = int(contest.row[e]), int(contest.column[e])
        chosen = bool(contest.held[i] == j)
        detection = int(contest.detections[j])
        holder = np.flatnonzero(contest.held == j)
        overlap = float(contest.overlap[e]) if contest.rule.boxes else None
        source = LEDGER if contest.recorded[e] else RECOMPUTED
        return Alternative(
            decision="pair",
            track=int(contest.tracks[i]),
            detection=detection,
            line=self.record.line_of(detection),
            chosen=chosen,
            runner_up=runner_up,
            cost=_known(contest.cost[e]),
            terms={
                name: float(values[e])
                for name, values in contest.terms.items()
                if not math.isnan(values[e])
            },
            gate=gate_of(
                contest.rule,
                self.gate_probability(tier),
                float(contest.distance[e]),
                overlap,
                source,
            ),
            force_cost=force_cost,
            odds="" if chosen or force_cost is None else odds(force_cost),
            held_by=None if chosen or not len(holder) else int(contest.tracks[holder[0]]),
            holds=None
            if chosen or contest.held[i] < 0
            else int(contest.detections[contest.held[i]]),
            changes=changes,
            source=source,
        )

    def _unpaired(
        self,
        contest: Contest,
        track: int | None,
        detection: int | None,
        chosen: bool,
        force_cost: float | None,
        runner_up: bool,
    ) -> Alternative:
        """Missing the track, or leaving the detection over."""
        changes = self._left(contest, track, detection)[1] if runner_up else ()
        return Alternative(
            decision="new" if track is None else "miss",
            track=track,
            detection=detection,
            line=self.record.line_of(detection),
            chosen=chosen,
            runner_up=runner_up,
            cost=0.0 if track is None else contest.miss_of(track),
            terms={},
            gate=None,
            force_cost=force_cost,
            odds="" if chosen or force_cost is None else odds(force_cost),
            held_by=None,
            holds=None,
            changes=changes,
            source=LEDGER if chosen or contest.recorded.all() else RECOMPUTED,
        )

    def _outside(
        self, contest: Contest, tier: int, track: int | None, detection: int | None
    ) -> tuple[Outside, ...]:
        """The nearest that took part in the tier and were outside the gate."""
        rows = self.record.decisions
        inside = contest.candidates_of(track=track, detection=detection)
        took_part = rows.chosen & (rows.tier == tier)
        if track is not None:
            others = np.unique(rows.detection[took_part & (rows.detection >= 0)])
            others = np.setdiff1d(others, contest.detections[contest.column[inside]])
            row = self.record.row_of(track)
            assert row is not None, "only live tracks take part"
            pairs = [(row, j) for j in others.tolist()]
        else:
            assert detection is not None
            others = np.unique(rows.track[took_part & (rows.track >= 0)])
            others = np.setdiff1d(others, contest.tracks[contest.row[inside]])
            places = np.searchsorted(self.record.track, others)
            pairs = [(i, detection) for i in places.tolist()]
        return nearest_outside(
            self.record,
            self.rules,
            tier,
            self.gate_probability(tier),
            pairs,
            at_least_one=not len(inside),
        )


def _rank(chosen: bool, nats: float | None) -> tuple[bool, bool, float]:
    """Sorts what was chosen first, then the known by what they cost, then the unknown."""
    return not chosen, nats is None, 0.0 if nats is None else nats


def _known(value: float) -> float | None:
    return None if math.isnan(value) else float(value)
