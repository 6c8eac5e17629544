"""One frame as the ledger has it: live tracks, detections, decisions, births."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from tracker.diagnosis.ledger_reading import Event, RunLedger
from tracker.errors import InputError
from tracker.log.model import Floats, Ints
from tracker.results.read import square_matrices

SHOWN_NUMBERS = 12  # that many ids are named in an error


@dataclass(frozen=True, slots=True, eq=False)
class DecisionRows:
    """Rows of decisions.parquet as arrays; -1 for no track or detection, nan for no number."""

    tier: Ints
    component: Ints
    decision: NDArray  # (r,) 'pair', 'miss', 'new'
    track: Ints
    detection: Ints
    chosen: NDArray[np.bool_]
    contested: NDArray[np.bool_]
    cost: Floats
    distance: Floats
    overlap: Floats
    margin: Floats
    force_cost: Floats
    terms: dict[str, Floats]

    def __len__(self) -> int:
        return len(self.tier)

    def where(self, wanted: NDArray[np.bool_]) -> Ints:
        """Numbers of the wanted rows."""
        return np.flatnonzero(wanted)


@dataclass(frozen=True, slots=True, eq=False)
class FrameRecord:
    """Everything the ledger says about a frame.

    track, state, unseen, detected (P_D), estimate, covariance : (k,) … (k, d) (k, d, d) live tracks
    as predicted.   line, score, label, z, variance : the detections; -1 and nan for what is
    missing.   born : the track that each birth detection started.
    """

    number: int
    time: float | None
    track: Ints
    state: list[str]
    unseen: Floats
    detected: Floats
    estimate: Floats
    covariance: Floats
    line: Ints
    score: Floats
    label: list[str | None]
    z: Floats
    variance: Floats
    decisions: DecisionRows
    events: list[Event]
    born: dict[int, int]

    def row_of(self, track: int) -> int | None:
        """Row of a live track, None if it was not live when the frame was associated."""
        found = np.flatnonzero(self.track == track)
        return int(found[0]) if len(found) else None

    def line_of(self, detection: int | None) -> int | None:
        """Source line of a detection."""
        if detection is None or self.line[detection] < 0:
            return None
        return int(self.line[detection])

    def given_to(self, detection: int) -> int | None:
        """The live track that a detection was paired with."""
        rows = self.decisions
        found = np.flatnonzero(
            rows.chosen & (rows.decision == "pair") & (rows.detection == detection)
        )
        return int(rows.track[found[0]]) if len(found) else None

    def given(self, track: int) -> int | None:
        """The detection that a live track was paired with."""
        rows = self.decisions
        found = np.flatnonzero(rows.chosen & (rows.decision == "pair") & (rows.track == track))
        return int(rows.detection[found[0]]) if len(found) else None


def read_frame(ledger: RunLedger, frame: int) -> FrameRecord:
    """Read one frame.

    Raises InputError for a frame that is not in the run, saying which are, and for a ledger that
    lacks a column.
    """
    try:
        return _read_frame(ledger, frame)
    except KeyError as error:
        raise InputError(
            f"has a ledger of another version: {error.args[0]}",
            path=ledger.folder,
            remedy="Run 'margent associate' again.",
        ) from None


def _read_frame(ledger: RunLedger, frame: int) -> FrameRecord:
    predictions = ledger.rows("predictions", frame, frame)
    detections = ledger.rows("detections", frame, frame)
    if not len(predictions) and not len(detections):
        raise InputError(_no_such_frame(ledger, frame), path=ledger.folder)
    table = ledger.rows("decisions", frame, frame)
    decisions = _decision_rows(table)
    events = ledger.events(frame=frame)
    names = ledger.coordinates
    times = table["time"].slice(0, 1).to_pylist() or [event.time for event in events]
    record = FrameRecord(
        number=frame,
        time=times[0] if times else None,
        track=_whole(predictions, "track"),
        state=predictions["state"].to_pylist(),
        unseen=_real(predictions, "unseen_seconds"),
        detected=_real(predictions, "detection_probability"),
        estimate=_stacked(predictions, names),
        covariance=square_matrices(predictions["covariance"], len(names)),
        line=_whole(detections, "line"),
        score=_real(detections, "score"),
        label=detections["label"].to_pylist(),
        z=_stacked(detections, names),
        variance=_stacked(detections, [f"variance_{name}" for name in names]),
        decisions=decisions,
        events=events,
        born={},
    )
    record.born.update(_births(record, ledger.settings.lifecycle.birth_score))
    return record


def some_of(numbers: list[int]) -> str:
    """A few numbers for a sentence, and how many there are."""
    shown = ", ".join(str(number) for number in numbers[:SHOWN_NUMBERS])
    if len(numbers) > SHOWN_NUMBERS:
        shown += f", … ({len(numbers)} in all)"
    return shown or "none"


def _no_such_frame(ledger: RunLedger, frame: int) -> str:
    span = ledger.first_and_last()
    if span is None:
        return f"there is no frame {frame}: the run has neither detections nor tracks"
    if not span[0] <= frame <= span[1]:
        return f"there is no frame {frame}; frames go from {span[0]} to {span[1]}"
    earlier, later = ledger.frames_around(frame, 1, 1)
    return (
        f"frame {frame} has neither live tracks nor detections (it was empty or not in the log); "
        f"the nearest that have are {' and '.join(map(str, earlier + later))}"
    )


def _births(record: FrameRecord, birth_score: float | None) -> dict[int, int]:
    """Match this frame's births to its detections.

    Births take unpaired detections scored at or above the birth score, ids rising with their
    number in the frame, so the two lists run side by side.
    """
    ids = sorted(event.track for event in record.events if event.reason == "born")
    rows = record.decisions
    paired = rows.detection[rows.chosen & (rows.decision == "pair")]
    free = np.ones(len(record.z), np.bool_)
    free[paired] = False
    if birth_score is not None:
        free &= ~(record.score < birth_score)
    eligible = np.flatnonzero(free).tolist()
    return dict(zip(eligible, ids, strict=True)) if len(eligible) == len(ids) else {}


def _decision_rows(table: pa.Table) -> DecisionRows:
    return DecisionRows(
        tier=_whole(table, "tier"),
        component=_whole(table, "component"),
        decision=np.array(table["decision"].to_pylist(), dtype=object),
        track=_whole(table, "track"),
        detection=_whole(table, "detection"),
        chosen=table["chosen"].to_numpy().astype(np.bool_),
        contested=table["contested"].to_numpy().astype(np.bool_),
        cost=_real(table, "cost"),
        distance=_real(table, "distance"),
        overlap=_real(table, "overlap"),
        margin=_real(table, "margin"),
        force_cost=_real(table, "force_cost"),
        terms={
            name.removeprefix("cost_"): _real(table, name)
            for name in table.column_names
            if name.startswith("cost_")
        },
    )


def _whole(table: pa.Table, name: str) -> Ints:
    return table[name].cast(pa.int64()).fill_null(-1).to_numpy()


def _real(table: pa.Table, name: str) -> Floats:
    return np.array(table[name].to_numpy(), np.float64)


def _stacked(table: pa.Table, names: list[str] | tuple[str, ...]) -> Floats:
    return np.ascontiguousarray(np.column_stack([_real(table, name) for name in names]))
