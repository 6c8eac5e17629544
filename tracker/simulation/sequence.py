"""A simulated sequence in memory: what the sensor delivered, and the truth."""

from __future__ import annotations

import hashlib
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from tracker.log.model import (
    Codes,
    DetectionLog,
    Floats,
    Ints,
    Kind,
    SequenceFacts,
    Truth,
    box_centre,
)
from tracker.simulation.sensors.delivery import Frames
from tracker.simulation.sensors.projection import Pose
from tracker.simulation.settings import SceneSettings
from tracker.simulation.tables import Columns, csv_bytes

CLUTTER = -1
FIRST_LINE = 2  # line 1 of a file is the header


@dataclass(frozen=True, slots=True, eq=False)
class Detections:
    """Detections as they are written, sorted by (frame, falling score).

    frame : (n,) index into the delivered frames.
    values : (n, d) in file columns (left, top, width, height or x, y), rounded as written.
    score : (n,).   label : (n,) codes of the sequence's labels.
    origin : (n,) the true object's number, `CLUTTER` for none; never written.
    sigma : (n, d) or None.   embedding : (n, k) or None.
    extra : further columns of the file, by name.
    """

    frame: Ints
    values: Floats
    score: Floats
    label: Codes
    origin: Ints
    sigma: Floats | None = None
    embedding: NDArray[np.float32] | None = None
    extra: dict[str, Floats] = field(default_factory=dict)

    def __len__(self) -> int:
        return len(self.values)


@dataclass(frozen=True, slots=True, eq=False)
class TrueObjects:
    """Objects that are in view, sorted by (frame, object).

    frame : (n,) index into the delivered frames.   object : (n,) numbers from 1, by appearance.
    values : (n, d) as in `Detections`.   label : (n,) codes.
    visibility : (n,) visible share, 0 to 1.
    probability : (n,) chance that it is detected in this frame; never written.
    xy, velocity : (n, 2) in the world's metres (or its own unit); never written.
    shape : (n, 3) length, width and heading where the sensor sees them, else None.
    """

    frame: Ints
    object: Ints
    values: Floats
    label: Codes
    visibility: Floats
    probability: Floats
    xy: Floats
    velocity: Floats
    shape: Floats | None = None

    def __len__(self) -> int:
        return len(self.values)


@dataclass(frozen=True, slots=True, eq=False)
class SimulatedSequence:
    """What `simulate` returns. `log()` and `truth()` need no file.

    `tables` holds every CSV file by name, ready to be written. `pose` is the camera's (F,) pose
    where the sensor is a camera. `notes` are further lines of sequence.toml, by name.
    """

    scene: str
    seed: int
    settings: SceneSettings
    kind: Kind
    facts: SequenceFacts
    frames: Frames
    labels: tuple[str, ...]
    detections: Detections
    objects: TrueObjects
    tables: dict[str, Columns]
    pose: Pose | None = None
    notes: dict[str, str] = field(default_factory=dict)

    @property
    def name(self) -> str:
        return self.facts.name or self.scene

    def log(self) -> DetectionLog:
        """The detection log, as `read_log` would read it from `detections.csv`."""
        found = self.detections
        # A reader sees only frames that have a detection.
        seen, first = np.unique(found.frame, return_index=True)
        label, labels = _used(found.label, self.labels)
        return DetectionLog(
            name=self.name,
            path=Path("detections.csv"),
            digest=self._digest("detections.csv"),
            format="csv",
            kind=self.kind,
            facts=self.facts,
            rate_hz=self.facts.frame_rate_hz or 1.0,
            rate_source="sequence.toml",
            frame_numbers=self.frames.number[seen],
            frame_times=self.frames.time[seen],
            offsets=np.append(first, len(found)).astype(np.int64),
            z=self._in_filter_order(found.values),
            score=found.score,
            label=label,
            line=np.arange(FIRST_LINE, len(found) + FIRST_LINE),
            labels=labels,
            sigma=found.sigma,
            embedding=found.embedding,
        )

    def truth(self) -> Truth:
        """The truth, as `read_truth` would read it from `truth.csv`."""
        true = self.objects
        label, labels = _used(true.label, self.labels)
        numbers, dense = np.unique(true.object, return_inverse=True)
        return Truth(
            name=self.name,
            path=Path("truth.csv"),
            digest=self._digest("truth.csv"),
            format="csv",
            kind=self.kind,
            facts=self.facts,
            frame=self.frames.number[true.frame],
            time=self.frames.time[true.frame],
            object=dense.astype(np.int64),
            object_names=tuple(str(number) for number in numbers.tolist()),
            z=self._in_filter_order(true.values),
            label=label,
            line=np.arange(FIRST_LINE, len(true) + FIRST_LINE),
            scored=np.ones(len(true), bool),
            visibility=true.visibility,
            labels=labels,
        )

    def _in_filter_order(self, values: Floats) -> Floats:
        return box_centre(values) if self.kind is Kind.BOX else values.copy()

    def _digest(self, file: str) -> str:
        return hashlib.sha256(csv_bytes(self.tables[file])).hexdigest()


def _used(label: Codes, labels: tuple[str, ...]) -> tuple[Codes, tuple[str, ...]]:
    """Codes into the labels that occur, which is all that a reader of the file knows."""
    used, codes = np.unique(label, return_inverse=True)
    return codes.astype(np.int32), tuple(labels[k] for k in used.tolist())
