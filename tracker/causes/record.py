"""A whole run's ledger in memory, looked up by frame, track and detection."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from pathlib import Path

import numpy as np
import pyarrow.csv
import pyarrow.parquet as pq

from tracker.association.associate import scored_inside
from tracker.association.rule import association_rules
from tracker.diagnosis.ledger_reading import RunLedger
from tracker.kernels.kalman import squared_mahalanobis
from tracker.kernels.overlap import box_overlap
from tracker.ledger import filter_names
from tracker.log.model import Floats, Ints, Kind
from tracker.results import Tracks, TrackState, read_run
from tracker.results.read import square_matrices


@dataclass(frozen=True, slots=True)
class Candidate:
    """What the ledger or the gate says of one track and one detection of a frame.

    inside : within the gate of the first tier.   distance : d².   force_cost : nats, nan if the
    ledger left the candidate out.
    """

    inside: bool
    distance: float
    overlap: float
    force_cost: float


class RunRecord:
    """Everything that a run folder says, for diagnosis.

    Raises InputError if the folder is no run or has no ledger.
    """

    def __init__(self, folder: str | Path) -> None:
        self.folder = Path(folder)
        ledger = RunLedger(folder)
        self.settings = ledger.settings
        self.kind: Kind = ledger.kind
        self._rules = association_rules(self.settings, self.kind)
        self.rule = self._rules[0]
        self.tracks: Tracks = read_run(folder, online=True)  # as the ledger has them
        names = filter_names(self.kind)
        decisions = pq.read_table(
            self.folder / "decisions.parquet",
            columns=["frame", "track", "detection", "chosen", "margin", "force_cost"],
        ).to_pydict()
        self.taken_by: dict[tuple[int, int], int] = {}  # (frame, detection) → track
        self.given: dict[tuple[int, int], int] = {}  # (frame, track) → detection
        self.margin: dict[tuple[int, int], float] = {}  # (frame, track) → margin of its decision
        self._forced: dict[tuple[int, int, int], float] = {}
        for frame, track, detection, chosen, margin, force in zip(*decisions.values(), strict=True):
            if track is not None and detection is not None:
                if chosen:
                    self.taken_by[frame, detection] = track
                    self.given[frame, track] = detection
                    self.margin[frame, track] = np.inf if margin is None else margin
                elif force is not None:
                    self._forced[frame, track, detection] = force
        seen = pq.read_table(self.folder / "detections.parquet")
        self.detection_frame: Ints = seen["frame"].to_numpy()
        self.detection_number: Ints = seen["detection"].to_numpy()
        self.z: Floats = np.column_stack([seen[name].to_numpy() for name in names])
        self.variance: Floats = np.column_stack(
            [seen[f"variance_{name}"].to_numpy() for name in names]
        )
        self.score: Floats = np.array(seen["score"].to_numpy(), np.float64)
        expected = pq.read_table(self.folder / "predictions.parquet")
        self._prediction = {
            key: row
            for row, key in enumerate(
                zip(expected["frame"].to_pylist(), expected["track"].to_pylist(), strict=True)
            )
        }
        self.estimate: Floats = np.column_stack([expected[name].to_numpy() for name in names])
        self.unseen: Floats = expected["unseen_seconds"].to_numpy()
        self.covariance: Floats = square_matrices(expected["covariance"], self.kind.dimension)

    @cached_property
    def row_of_detection(self) -> dict[tuple[int, int], int]:
        """(frame, detection) → row of `z`."""
        keys = zip(self.detection_frame.tolist(), self.detection_number.tolist(), strict=True)
        return {key: row for row, key in enumerate(keys)}

    @cached_property
    def _events(self) -> dict[str, list]:
        return pyarrow.csv.read_csv(self.folder / "events.csv").to_pydict()

    @cached_property
    def ended(self) -> dict[int, int]:
        """Frame in which each track ended."""
        after, track, frame = (self._events[name] for name in ("to", "track", "frame"))
        return {t: f for t, f, word in zip(track, frame, after, strict=True) if word == "ended"}

    @cached_property
    def confirmed(self) -> dict[int, int]:
        """Frame in which each track was confirmed."""
        after, track, frame = (self._events[name] for name in ("to", "track", "frame"))
        found: dict[int, int] = {}
        for t, f, word in zip(track, frame, after, strict=True):
            if word == TrackState.CONFIRMED.word:
                found.setdefault(t, f)
        return found

    @cached_property
    def born_at(self) -> dict[tuple[int, int], int]:
        """(frame, detection) → the track that began there."""
        reason, track, frame = (self._events[name] for name in ("reason", "track", "frame"))
        born: dict[int, list[int]] = {}
        for t, f, word in zip(track, frame, reason, strict=True):
            if word == "born":
                born.setdefault(f, []).append(t)
        found = {}
        for f, tracks in born.items():
            first = int(np.searchsorted(self.detection_frame, f, side="left"))
            last = int(np.searchsorted(self.detection_frame, f, side="right"))
            free = [
                row
                for row in range(first, last)
                if (f, int(self.detection_number[row])) not in self.taken_by
                and not self.too_weak_for_birth(row)
            ]
            for t, row in zip(sorted(tracks), free, strict=False):
                found[f, int(self.detection_number[row])] = t
        return found

    def too_weak_for_birth(self, row: int) -> bool:
        """Whether a detection's score keeps it from starting a track."""
        limit = self.settings.lifecycle.birth_score
        return limit is not None and bool(self.score[row] < limit)

    def outside_all_tiers(self, row: int) -> bool:
        """Whether no tier takes detections of that score."""
        score = self.score[row : row + 1]
        return not any(scored_inside(score, rule)[0] for rule in self._rules)

    def expected(self, frame: int, track: int) -> int | None:
        """Row of the track's prediction in a frame, None if it was not alive."""
        return self._prediction.get((frame, track))

    def candidate(self, frame: int, track: int, detection: int) -> Candidate | None:
        """What is known of a pair, None if the track was not alive."""
        row = self.expected(frame, track)
        if row is None:
            return None
        at = self.row_of_detection[frame, detection]
        d = self.kind.dimension
        distance, _ = squared_mahalanobis(
            self.estimate,
            self.covariance,
            row,
            self.z,
            self.variance,
            at,
            np.empty((d + 2, d)),
            True,
        )
        overlap = box_overlap(self.estimate, row, self.z, at) if self.kind is Kind.BOX else 1.0
        inside = distance <= self.rule.threshold and overlap >= self.rule.overlap_floor
        force = self._forced.get((frame, track, detection), np.nan)
        return Candidate(bool(inside), float(distance), float(overlap), float(force))
