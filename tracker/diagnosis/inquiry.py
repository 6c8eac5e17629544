"""One frame of a run, opened to be asked: its decisions with what else could have been decided."""

from __future__ import annotations

import math

import numpy as np

from tracker.diagnosis.contest import Contest, read_contest, read_rules
from tracker.diagnosis.explanation import Alternative, Decision, Gate, Outside
from tracker.diagnosis.frame_record import FrameRecord, read_frame
from tracker.diagnosis.gating import gate_of, measure_gate, nearest_outside
from tracker.diagnosis.history import Life, read_life
from tracker.diagnosis.ledger_reading import RunLedger
from tracker.diagnosis.words import odds
from tracker.log.model import Floats, Ints

# A runner-up's force cost is the margin, up to the rounding of two ways to add it up.
SAME_NATS = 1e-6


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
        contest = self._contest(r)
        track = int(rows.track[r]) if rows.track[r] >= 0 else None
        detection = int(rows.detection[r]) if rows.detection[r] >= 0 else None
        margin = float(rows.margin[r])
        if by_detection:
            asked = contest.candidates_of(detection=detection)
        else:
            asked = contest.candidates_of(track=track)
        unpaired = self._unpaired(contest, None if by_detection else track, detection)
        options = [self._pair(contest, tier, e) for e in asked.tolist()]
        outside: tuple[Outside, ...] = ()
        if with_outside:
            outside = self._outside(tier, asked, contest, None if by_detection else track, detection)
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
            alternatives=self._ranked(contest, tier, [*options, unpaired], margin),
            outside=outside,
        )
