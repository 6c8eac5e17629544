"""Rows of tracks as two files of a run folder, a chunk at a time: CSV for people, and Parquet."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pyarrow as pa
import pyarrow.csv
import pyarrow.parquet as pq

from tracker.log.model import DetectionLog, Ints
from tracker.results.parquet import ROW_GROUP, open_parquet
from tracker.results.recorder import TrackRows, no_rows
from tracker.results.table import csv_table, parquet_table


class TrackFiles:
    """NAME.csv and NAME.parquet in a folder that exists."""

    def __init__(self, folder: Path, name: str, log: DetectionLog) -> None:
        self._path = folder / f"{name}.parquet"
        self._kind, self._labels = log.kind, log.labels
        self._csv = (folder / f"{name}.csv").open("wb")
        self._parquet: pq.ParquetWriter | None = None
        self._waiting: list[TrackRows] = []
        self._waiting_rows = 0
        self.counts = {"track_rows": 0, "reported_rows": 0}

    def close(self) -> None:
        """Let go of the files."""
        self._csv.close()
        if self._parquet is not None:
            self._parquet.close()

    def add(self, rows: TrackRows) -> None:
        """Take rows in, which follow those before."""
        self._waiting.append(rows)
        self._waiting_rows += len(rows)
        if self._waiting_rows >= ROW_GROUP:
            self._flush()

    def finish(self) -> None:
        """Write what is left; files without any row have their columns."""
        if self._waiting or self._parquet is None:
            self._flush()

    def add_with_online(self, rows: TrackRows, online: Ints) -> None:
        """Write rows at once, with the engine's track of each (-1: none) as a last column."""
        for begin in range(0, max(1, len(rows)), ROW_GROUP):
            some = slice(begin, begin + ROW_GROUP)
            part = TrackRows(*(getattr(rows, name)[some] for name in TrackRows.__slots__))
            engine = online[some]
            self._write(part, pa.array(engine, mask=engine < 0))

    def _flush(self) -> None:
        rows = TrackRows.join(self._waiting) if self._waiting else no_rows(self._kind)
        self._waiting, self._waiting_rows = [], 0
        self._write(rows, None)

    def _write(self, rows: TrackRows, online: pa.Array | None) -> None:
        first = self._parquet is None
        table = parquet_table(rows, self._kind, self._labels)
        shown = csv_table(rows, self._kind, self._labels)
        if online is not None:
            table = table.append_column("online_track", online)
            shown = shown.append_column("online_track", online)
        if self._parquet is None:
            self._parquet = open_parquet(self._path, table.schema)
        self._parquet.write_table(table, row_group_size=ROW_GROUP)
        write_csv_chunk(self._csv, shown, header=first)
        self.counts["track_rows"] += len(rows)
        self.counts["reported_rows"] += int(np.sum(rows.reported))


def write_csv_chunk(sink: Any, table: pa.Table, *, header: bool) -> None:
    """Append a table to a CSV; text is quoted only where it must be."""
    if header:
        sink.write((",".join(table.column_names) + "\n").encode())
    plain = not any(
        pa.types.is_string(field.type) and _needs_quotes(table[field.name])
        for field in table.schema
    )
    options = pa.csv.WriteOptions(include_header=False, quoting_style="none" if plain else "needed")
    pa.csv.write_csv(table, sink, options)


def _needs_quotes(words: pa.ChunkedArray) -> bool:
    return any(
        word is not None and any(sign in word for sign in ',"\n\r')
        for word in words.unique().to_pylist()
    )
