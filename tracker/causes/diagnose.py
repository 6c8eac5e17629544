"""Find every error of a run and its cause."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from tracker.causes.judge import Judge, Verdict
from tracker.causes.model import Cause, Error, Finding
from tracker.causes.pairing import FalseRows, Objects, pair_objects
from tracker.causes.record import RunRecord
from tracker.evaluation.scope import Scope
from tracker.kernels.overlap import overlap_matrix
from tracker.log.model import Kind, Truth

# A detection that overlaps an annotated object this much is on it, though another is closer.
BESIDE_OVERLAP = 0.3


@dataclass(frozen=True, slots=True)
class Diagnosis:
    """All findings of a run, in order of frame."""

    name: str
    findings: tuple[Finding, ...]

    def of(self, error: Error) -> tuple[Finding, ...]:
        """The findings of one kind."""
        return tuple(item for item in self.findings if item.error is error)


def diagnose(run: str | Path, truth: Truth, scope: Scope | None = None) -> Diagnosis:
    """Trace every switch, break, miss, false track and late confirmation of a run to a cause.

    run : a run folder with a ledger.   scope : as in `evaluate`.

    Raises InputError for a folder that is no run or has no ledger, and what `evaluate` raises.
    """
    record = RunRecord(run)
    scope = scope or Scope()
    objects, false_rows, of_detection = pair_objects(record, truth, scope)
    judge = Judge(record, objects)
    found = [
        *_object_errors(objects, judge),
        *_false_tracks(record, objects, false_rows, of_detection),
    ]
    found.sort(key=lambda item: (item.frame, item.error, item.object, item.track or 0))
    return Diagnosis(record.tracks.name, tuple(found))


def _object_errors(objects: Objects, judge: Judge) -> Iterator[Finding]:
    bounds = np.flatnonzero(np.diff(objects.object, prepend=-1, append=-1))
    for first, end in zip(bounds[:-1].tolist(), bounds[1:].tolist(), strict=True):
        last_row = -1  # where the object was tracked last
        for row in range(first, end):
            track = int(objects.track[row])
            if track < 0:
                continue
            missing = range(last_row + 1 if last_row >= 0 else first, row)
            before = int(objects.track[last_row]) if last_row >= 0 else None
            if len(missing) and before is None:
                yield _untracked(Error.LATE, objects, judge, missing, track)
            elif before is not None and (len(missing) or track != before):
                verdict = judge.lost(before, last_row, row)
                if len(missing):
                    yield _finding(Error.BREAK, verdict, objects, missing, track, before)
                if track != before:
                    yield _finding(
                        Error.SWITCH, verdict, objects, range(row, row + 1), track, before
                    )
            last_row = row
        if last_row < 0:
            yield _untracked(Error.MISS, objects, judge, range(first, end), None)
        elif last_row < end - 1:
            before = int(objects.track[last_row])
            verdict = judge.lost(before, last_row, end - 1)
            missing = range(last_row + 1, end)
            yield _finding(Error.MISS, verdict, objects, missing, None, before)


def _untracked(
    error: Error, objects: Objects, judge: Judge, rows: range, track: int | None
) -> Finding:
    """A stretch without an earlier track: the commonest cause of its rows."""
    verdicts = [judge.untracked(row) for row in rows]
    return _finding(error, _commonest(verdicts), objects, rows, track, None)


def _commonest(verdicts: list[Verdict]) -> Verdict:
    """The first verdict of the commonest cause; of equals the one met first."""
    cause, _ = Counter(item.cause for item in verdicts).most_common(1)[0]
    return next(item for item in verdicts if item.cause is cause)


def _finding(
    error: Error,
    verdict: Verdict,
    objects: Objects,
    rows: range,
    track: int | None,
    before: int | None,
) -> Finding:
    return Finding(
        error,
        verdict.cause,
        int(objects.frame[rows[0]]),
        int(objects.frame[rows[-1]]),
        float(objects.time[rows[0]]),
        len(rows),
        objects.names[objects.object[rows[0]]],
        track,
        before,
        verdict.frame,
        verdict.measure,
        verdict.unit,
        verdict.words,
    )


def _false_tracks(
    record: RunRecord,
    objects: Objects,
    false_rows: FalseRows,
    of_detection: dict[tuple[int, int], int],
) -> Iterator[Finding]:
    """One finding for each unbroken stretch of a track's false rows."""
    tracks = record.tracks
    by_frame: dict[int, list[int]] = {}
    for row, frame in enumerate(objects.frame.tolist()):
        by_frame.setdefault(frame, []).append(row)
    born = {(frame, track): detection for (frame, detection), track in record.born_at.items()}
    stretch: list[int] = []
    for row in [*false_rows.row.tolist(), -1]:
        if stretch and not (
            row >= 0
            and tracks.track[row] == tracks.track[stretch[-1]]
            and tracks.frame[row] - tracks.frame[stretch[-1]] == 1
        ):
            verdicts = [
                _false_row(record, objects, by_frame, born, of_detection, item) for item in stretch
            ]
            verdict = _commonest(verdicts)
            yield Finding(
                Error.FALSE,
                verdict.cause,
                int(tracks.frame[stretch[0]]),
                int(tracks.frame[stretch[-1]]),
                float(tracks.time[stretch[0]]),
                len(stretch),
                "",
                int(tracks.track[stretch[0]]),
                None,
                verdict.frame,
                verdict.measure,
                verdict.unit,
                verdict.words,
            )
            stretch = []
        stretch.append(row)


def _false_row(
    record: RunRecord,
    objects: Objects,
    by_frame: dict[int, list[int]],
    born: dict[tuple[int, int], int],
    of_detection: dict[tuple[int, int], int],
    row: int,
) -> Verdict:
    frame, track = int(record.tracks.frame[row]), int(record.tracks.track[row])
    detection = record.given.get((frame, track), born.get((frame, track)))
    if detection is None:
        return Verdict(Cause.COASTING, frame, words=f"track {track} coasts off its object")
    on = of_detection.get((frame, detection))
    there = by_frame.get(frame, [])
    if on is not None:
        owner = next((int(objects.track[k]) for k in there if objects.object[k] == on), -1)
        if owner >= 0:
            words = f"object '{objects.names[on]}' has track {owner} already"
            return Verdict(Cause.DUPLICATE, frame, words=words)
        return Verdict(Cause.POSITION, frame, words="its detection is on an object, its place off")
    at = record.row_of_detection[frame, detection]
    if there and record.kind is Kind.BOX:
        overlap = overlap_matrix(np.ascontiguousarray(objects.z[there]), record.z[at : at + 1])
        best = float(overlap.max())
        if best >= BESIDE_OVERLAP:
            return Verdict(
                Cause.DUPLICATE,
                frame,
                best,
                "IoU",
                f"a second detection on an object, IoU {best:.2f}",
            )
    return Verdict(Cause.CLUTTER, frame, words=f"track {track} follows detections of no object")
