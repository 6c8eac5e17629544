"""Read tracks back: the `tracks.csv` of a run, or anybody's file of identified rows."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from tracker.errors import InputError
from tracker.log.columns import Role
from tracker.log.detections import labels_of, measurement
from tracker.log.facts import name_of, read_facts
from tracker.log.identities import (
    IdentifiedRows,
    check_identified,
    flags,
    identified_rows,
    optional_numbers,
)
from tracker.log.model import Floats, Ints
from tracker.log.recognise import read_table
from tracker.log.sieve import Sieve
from tracker.log.source import locate, open_source
from tracker.log.timeline import choose_rate

if TYPE_CHECKING:
    from tracker.results.tracks import Tracks


def read_track_file(
    path: str | Path,
    *,
    columns: Mapping[str, str] | None = None,
    format: str | None = None,
) -> Tracks:
    """Read tracks from any format that `read_log` reads, with a column `track` (or `id`).

    Rows without a `state` count as confirmed, rows without `reported` as reported. Text
    identities are numbered from 0 in alphabetical order. A file with a header alone is an
    empty set of tracks.

    Raises
    ------
    InputError for a file that cannot be used, and for any row that cannot: scores of tracks
    with rows left out would mislead.
    """
    from tracker.results.tracks import Tracks, TrackState

    path = locate(path, "tracks")
    facts = read_facts(path)
    source = open_source(path)
    table = read_table(source, role=Role.TRACKS, columns=columns, format=format)
    sieve = Sieve(table)
    identities = check_identified(sieve, path, Role.TRACKS)
    reported = flags(sieve, "reported")
    codes = {state.word: int(state) for state in TrackState}
    state = _states(sieve, codes, default=int(TrackState.CONFIRMED))
    score = optional_numbers(sieve, "score")
    line = optional_numbers(sieve, "line")
    _refuse_any(sieve, path)
    rows = identified_rows(sieve, identities)
    label, labels = labels_of(table, rows.row)
    no_score = table.format == "benchmark" and bool(np.all(score == -1.0))
    return Tracks(
        name=name_of(path, facts),
        kind=table.kind,
        facts=facts,
        frame=rows.frame,
        time=_times(rows, facts_rate=choose_rate(rows.frame, None, facts, None)[0]),
        track=_track_numbers(rows),
        z=measurement(table, rows.row),
        score=np.full(len(rows.row), np.nan) if no_score else np.array(score[rows.row]),
        label=label,
        labels=labels,
        state=state[rows.row],
        reported=reported[rows.row],
        line=np.nan_to_num(line[rows.row], nan=-1.0).astype(np.int64),
    )


def _states(sieve: Sieve, codes: Mapping[str, int], *, default: int) -> NDArray[np.int8]:
    words = sieve.table.words.get("state")
    if words is None:
        return np.full(len(sieve.table), default, dtype=np.int8)
    unknown = np.array([word not in codes for word in words.words] + [False])
    sieve.reject(unknown[words.code], "state", f"must be {', '.join(codes)}")
    found = [codes.get(word, default) for word in words.words] + [default]
    return np.array(found, dtype=np.int8)[words.code]


def _refuse_any(sieve: Sieve, path: Path) -> None:
    rejections = sieve.rejections()
    if rejections:
        first = rejections[0]
        more = len(rejections) - 1
        others = f"; {more} more rows cannot be used either" if more else ""
        raise InputError(
            f"a row of this track file cannot be used: {first.reason}{others}",
            path=path,
            line=first.line,
            column=first.column or None,
            found=first.text[:80],
        )


def _times(rows: IdentifiedRows, *, facts_rate: float) -> Floats:
    return rows.frame / facts_rate if rows.time is None else rows.time


def _track_numbers(rows: IdentifiedRows) -> Ints:
    """The identities themselves where they are whole numbers, else their codes."""
    try:
        numbers = np.array([int(name) for name in rows.names], dtype=np.int64)
    except (ValueError, OverflowError):
        return rows.identity
    return numbers[rows.identity]
