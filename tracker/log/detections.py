"""Read a detection log: find it, take it apart, judge its rows, put them on a time axis."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path

import numpy as np

from tracker.errors import InputError
from tracker.log.columns import IDENTITY, Role
from tracker.log.facts import name_of, read_facts
from tracker.log.model import Codes, DetectionLog, Floats, Ints, Kind
from tracker.log.recognise import read_table
from tracker.log.sieve import Sieve, find_repeats, settle
from tracker.log.source import locate, open_source
from tracker.log.table import Table
from tracker.log.timeline import check_order, detection_timeline


def read_log(
    path: str | Path,
    *,
    columns: Mapping[str, str] | None = None,
    format: str | None = None,
    frame_rate_hz: float | None = None,
    drop_identities: bool = False,
    strict: bool = False,
) -> DetectionLog:
    """Read detections without identity from CSV, Parquet, NDJSON or the benchmark layout.

    Parameters
    ----------
    path : a file, or a folder with one file named ``detections.*``.
    columns : the file's column name → ours, for names that differ.
    format : 'csv', 'parquet', 'ndjson' or 'benchmark'; None recognises it from the content.
    frame_rate_hz : frames a second, where neither `sequence.toml` nor times say it.
    drop_identities : read a truth or track file as detections, its identities ignored.
    strict : raise RejectedRowsError if any row has to be rejected.

    Returns
    -------
    DetectionLog sorted by (frame, line). Rows that cannot be used are in its `rejections`,
    what was assumed, ignored or sorted in its `notes`.

    Raises
    ------
    InputError for a file that cannot be used, UsageError for arguments that make no sense.
    """
    path = locate(path, "detections")
    facts = read_facts(path)
    source = open_source(path)
    table = read_table(source, role=Role.DETECTIONS, columns=columns, format=format)
    notes = [*_identities(table, path, drop_identities), *table.notes]
    optional, empty = _optional_numbers(table)
    if empty:
        notes.append(f"empty columns were ignored: {', '.join(empty)}")
    sieve = Sieve(table)
    sieve.measurement()
    for name in optional:
        sieve.numbers(name)
        if name.startswith("sigma_"):
            sieve.positive(name)
    check_order(sieve)
    _reject_repeats(sieve)
    rejections = settle(sieve, path, strict=strict)
    timeline = detection_timeline(sieve, facts, frame_rate_hz)
    notes += timeline.notes

    rows = sieve.kept
    if timeline.order is not None:
        rows = np.flatnonzero(sieve.keep)[timeline.order]
    embedding = _group(table, optional, "embedding_", rows)
    score, score_notes = _score(table, optional, rows)
    label, labels = labels_of(table, rows)
    sensors = table.words["sensor"].words if "sensor" in table.words else ()
    if len(sensors) > 1:
        notes.append(
            f"the log has {len(sensors)} sensors ({', '.join(sensors[:6])}"
            f"{', …' if len(sensors) > 6 else ''}); they are read as if they were one"
        )
    return DetectionLog(
        name=name_of(path, facts),
        path=path,
        digest=source.digest,
        format=table.format,
        kind=table.kind,
        facts=facts,
        rate_hz=timeline.rate_hz,
        rate_source=timeline.rate_source,
        frame_numbers=timeline.numbers,
        frame_times=timeline.times,
        offsets=timeline.offsets,
        z=measurement(table, rows),
        score=score,
        label=label,
        line=table.line[rows],
        labels=labels,
        sigma=_group(table, optional, "sigma_", rows),
        embedding=None if embedding is None else embedding.astype(np.float32),
        rejections=rejections,
        notes=(*notes, *score_notes),
    )


def measurement(table: Table, rows: Ints | slice) -> Floats:
    """(n, d) measurements of these rows in filter order."""
    columns = [table.numbers[name].values[rows] for name in table.kind.columns]
    if table.kind is Kind.BOX:
        left, top, width, height = columns
        columns = [left + 0.5 * width, top + 0.5 * height, width, height]
    return _stacked(columns)


def labels_of(table: Table, rows: Ints | slice) -> tuple[Codes, tuple[str, ...]]:
    """(n,) label codes of these rows (-1 without one), and the labels that occur in them."""
    words = table.words.get("label")
    if words is None:
        return np.full(len(table.line[rows]), -1, dtype=np.int32), ()
    code = words.code[rows]
    used = np.flatnonzero(np.bincount(code[code >= 0], minlength=len(words.words)))
    if len(used) == len(words.words):
        return code, words.words
    rank = np.full(len(words.words) + 1, -1, dtype=np.int32)
    rank[used] = np.arange(len(used))
    return rank[code], tuple(words.words[k] for k in used.tolist())


def _identities(table: Table, path: Path, drop: bool) -> list[str]:
    """A note if identities are dropped; InputError if there are some and may not be."""
    column = next((n for n in IDENTITY if n in table.words and _says_who(table, n)), None)
    if column is None:
        return []
    count = len(table.words[column].words)
    what = "second column" if table.format == "benchmark" else f"column '{column}'"
    identities = f"{count} {'identity' if count == 1 else 'identities'}"
    if drop:
        return [f"this is a truth or track file; the {identities} in its {what} were dropped"]
    raise InputError(
        f"this is a truth or track file, not a detection log: its {what} holds {identities}",
        path=path,
        remedy="Give the log of detections, or add --drop-identities to use the rows of this "
        "file as detections.",
    )


def _says_who(table: Table, column: str) -> bool:
    """Whether an identity column says anything: -1 (in the benchmark layout 0 too) does not."""
    none = {"-1", "-1.0"} | ({"0", "0.0"} if table.format == "benchmark" else set())
    return not none.issuperset(table.words[column].words)


def _optional_numbers(table: Table) -> tuple[list[str], list[str]]:
    """Optional columns of numbers that are in use, and those without a single value."""
    required = {"frame", "time", *table.kind.columns}
    names = [name for name in table.numbers if name not in required]
    empty = []
    for name in names:
        missing = table.numbers[name].missing
        if missing is not None and len(missing) and missing.all():
            empty.append(name)
    partly = [name for name in empty if name.startswith(("sigma_", "embedding_"))]
    groups = {name.partition("_")[0] for name in partly}
    used = [n for n in names if n not in empty and n.partition("_")[0] not in groups]
    return used, empty


def _reject_repeats(sieve: Sieve) -> None:
    """Reject rows that say again what an earlier row said: same frame, values, score, label."""
    table = sieve.table
    names = ["frame" if "frame" in table.numbers else "time", *table.kind.columns]
    names += ["score"] if "score" in table.numbers else []
    kept = sieve.kept
    columns: list[Floats | Ints | Codes] = [table.numbers[name].values[kept] for name in names]
    columns += [table.words[n].code[kept] for n in ("label", "sensor") if n in table.words]
    repeats, originals = find_repeats(columns)
    if not len(repeats):
        return
    row_of = np.flatnonzero(sieve.keep)
    reasons = {
        int(row_of[row]): f"duplicate of {sieve.line_of(row_of[original])}"
        for row, original in zip(repeats.tolist(), originals.tolist(), strict=True)
    }
    sieve.reject_rows(row_of[repeats], "", reasons.__getitem__)


def _score(table: Table, optional: list[str], rows: Ints | slice) -> tuple[Floats, tuple[str, ...]]:
    if "score" not in optional:
        return np.full(len(table.line[rows]), np.nan), ()
    score = table.numbers["score"].values[rows]
    if table.format == "benchmark" and len(score) and np.all(score == -1.0):
        return np.full(len(score), np.nan), ("every confidence is -1: the log has no scores",)
    return score, ()


def _stacked(columns: list[Floats]) -> Floats:
    """(n, k) from k columns, row by row in memory."""
    out = np.empty((len(columns[0]), len(columns)))
    for k, column in enumerate(columns):
        out[:, k] = column
    return out


def _group(table: Table, optional: list[str], prefix: str, rows: Ints | slice) -> Floats | None:
    """(n, k) of the optional columns whose names begin with `prefix`, or None."""
    names = [name for name in optional if name.startswith(prefix)]
    return _stacked([table.numbers[name].values[rows] for name in names]) if names else None
