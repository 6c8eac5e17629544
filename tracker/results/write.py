"""Write a run folder, a chunk at a time: tracks, events, rejections, settings, facts."""

from __future__ import annotations

import csv
import json
from pathlib import Path
from types import TracebackType
from typing import Any, Self

import numpy as np
import pyarrow as pa

from tracker.engine import FrameResult, Transitions
from tracker.ledger import Ledger
from tracker.lifecycle.rules import Reason
from tracker.log.model import DetectionLog, Floats, Frame, Ints, Rejection
from tracker.results.parquet import ROW_GROUP
from tracker.results.recorder import Recorder
from tracker.results.table import STATE_WORDS
from tracker.results.track_files import TrackFiles, write_csv_chunk
from tracker.results.tracks import TRACKS
from tracker.settings import Settings, settings_as_toml

CAMERA_COLUMNS = (
    "frame",
    "shift_x",
    "shift_y",
    "zoom",
    "rotation",
    "centre_x",
    "centre_y",
    "evidence",
    "support",
)
EVENT_COLUMNS = ("frame", "time", "track", "from", "to", "reason")
REASON_WORDS = pa.array([reason.words for reason in Reason])
REJECTION_COLUMNS = ("line", "column", "reason", "text")


class RunWriter:
    """Writes into `folder`, which must exist; use as a context manager.

    tracks : what the files of tracks are called.

    The rows' order and grouping depend on the log and the settings alone, so the same input gives
    the same bytes.
    """

    def __init__(
        self, folder: Path, log: DetectionLog, settings: Settings, *, tracks: str = TRACKS
    ) -> None:
        self._folder = folder
        self._log = log
        self._settings = settings
        self._recorder = Recorder(settings, log.kind)
        self._ledger = Ledger(folder, log.kind, settings, log.labels)
        self.counts = {"tracks_confirmed": 0, "track_rows": 0, "reported_rows": 0, "events": 0}
        self._tracks = TrackFiles(folder, tracks, log)
        self._events = (folder / "events.csv").open("wb")
        self._events.write((",".join(EVENT_COLUMNS) + "\n").encode())
        self._camera: list[tuple[float, ...]] = []
        self._events_waiting: list[tuple[Ints, Floats, Transitions]] = []
        self._events_written = 0

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        error: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        self._ledger.close()
        self._tracks.close()
        self._events.close()

    def add(self, frame: Frame, result: FrameResult) -> None:
        """Take one frame's result in."""
        self._note_events(result)
        if result.camera is not None:
            self._camera.append((result.number, *result.camera.values))
        self._ledger.add(frame, result)
        for rows in self._recorder.add(frame, result):
            self._tracks.add(rows)

    def finish(self, facts: dict[str, Any]) -> None:
        """Write everything that was held back, and `facts` as run.json."""
        for rows in self._recorder.finish():
            self._tracks.add(rows)
        self._tracks.finish()
        self._flush_events()
        self.counts |= self._tracks.counts
        self.counts["contested_decisions"] = self._ledger.contested
        self.counts["tracks_confirmed"] = self._recorder.confirmed
        if self._camera:
            write_camera(self._folder / "camera.csv", self._camera)
        write_rejections(self._folder / "rejected.csv", self._log.rejections)
        (self._folder / "settings.toml").write_text(
            settings_as_toml(self._settings), encoding="utf-8"
        )
        write_json(self._folder / "run.json", facts | {"counts": facts["counts"] | self.counts})

    def _note_events(self, result: FrameResult) -> None:
        events = result.transitions
        count = len(events.track)
        if not count:
            return
        self._events_waiting.append(
            (np.full(count, result.number), np.full(count, result.time), events)
        )
        self.counts["events"] += count
        if self.counts["events"] - self._events_written >= ROW_GROUP:
            self._flush_events()

    def _flush_events(self) -> None:
        if self._events_waiting:
            table = events_table(self._events_waiting)
            write_csv_chunk(self._events, table, header=False)
        self._events_waiting = []
        self._events_written = self.counts["events"]


def events_table(parts: list[tuple[Ints, Floats, Transitions]]) -> pa.Table:
    """Events as words: state before (none at a birth), state after, reason."""
    before = np.concatenate([events.before for _, _, events in parts])
    columns = (
        pa.array(np.concatenate([frame for frame, _, _ in parts])),
        pa.array(np.round(np.concatenate([time for _, time, _ in parts]), 6)),
        pa.array(np.concatenate([events.track for _, _, events in parts])),
        STATE_WORDS.take(pa.array(before, mask=before < 0)),
        STATE_WORDS.take(pa.array(np.concatenate([events.after for _, _, events in parts]))),
        REASON_WORDS.take(pa.array(np.concatenate([events.reason for _, _, events in parts]))),
    )
    return pa.table(dict(zip(EVENT_COLUMNS, columns, strict=True)))


def write_camera(path: Path, steps: list[tuple[float, ...]]) -> None:
    """camera.csv: how the image moved before each frame in which that is known."""
    with path.open("w", encoding="utf-8", newline="") as file:
        rows = csv.writer(file, lineterminator="\n")
        rows.writerow(CAMERA_COLUMNS)
        for number, *values in steps:
            rows.writerow((number, *("" if value != value else f"{value:.7g}" for value in values)))


def write_rejections(path: Path, rejections: tuple[Rejection, ...]) -> None:
    """rejected.csv: every row that was not used, why, and its original text."""
    with path.open("w", encoding="utf-8", newline="") as file:
        rows = csv.writer(file, lineterminator="\n")
        rows.writerow(REJECTION_COLUMNS)
        for item in rejections:
            rows.writerow((item.line, item.column, item.reason, item.text))


def write_json(path: Path, values: dict[str, Any]) -> None:
    """Indented JSON in the order given."""
    path.write_text(json.dumps(values, indent=2, ensure_ascii=False) + "\n", encoding="utf-8")
