"""NDJSON: one JSON object a line, its keys the column names."""

from __future__ import annotations

import json
from collections.abc import Iterator, Mapping, Sequence
from functools import partial
from operator import attrgetter
from typing import Any

import msgspec
import numpy as np

from tracker.errors import InputError
from tracker.log.columns import Role, choose_columns, optional_numbers, optional_words
from tracker.log.model import Codes, Ints, Rejection
from tracker.log.source import Source
from tracker.log.table import Mask, Numbers, Table, Words, sorted_words, spelling

NAME = "ndjson"
_CHUNK = 1 << 20  # bytes decoded at once; small enough to stay in the processor's cache
_SAMPLE_ROWS = 100  # rows whose keys are looked at for names that are not ours

# What a cell holds until it is known to be a number or to be refused.
_MISSING, _UNREADABLE = None, msgspec.UNSET


def read(source: Source, mapping: Mapping[str, str], role: Role) -> Table:
    """Read one object a line; keys may be left out where a value is missing.

    Names are looked for in the first rows, the optional ones of ours in all rows. Raises
    InputError if they do not fit the role.
    """
    names, first_line = _names(source.data)
    if not names:
        raise InputError("there is no JSON object in this file", path=source.path)
    choice = choose_columns(names, mapping, role=role, path=source.path, line=first_line)
    numbers = dict(choice.numbers)
    words = dict(choice.words)
    for name in optional_numbers(role):
        if name not in mapping:
            numbers.setdefault(name, name)
    for name in optional_words(role):
        if name not in mapping:
            words.setdefault(name, name)
    decoder = _decoder(numbers, words)
    number_parts: dict[str, list[Numbers]] = {name: [] for name in numbers}
    coded = {name: _Coder() for name in words}
    line_parts: list[Ints] = []
    refused: list[Rejection] = []
    for first, chunk, count in _chunks(source.data):
        rows = _decode_fast(decoder, chunk, count)
        plain = rows is not None
        if rows is None:
            rows, line = _decode_careful(decoder, numbers, words, chunk, first, refused)
        else:
            line = np.arange(first, first + len(rows), dtype=np.int64)
        line_parts.append(line)
        for name, parts in number_parts.items():
            parts.append(_numbers(list(map(attrgetter(name), rows)), plain=plain))
        for name, coder in coded.items():
            coder.add(list(map(attrgetter(name), rows)))
    line = np.concatenate(line_parts)
    number_columns = {name: _joined(parts) for name, parts in number_parts.items()}
    word_columns = {name: coder.words() for name, coder in coded.items()}
    return Table(
        NAME,
        choice.kind,
        {n: c for n, c in number_columns.items() if n in choice.numbers or not _is_empty(c)},
        {n: c for n, c in word_columns.items() if n in choice.words or c.words},
        line,
        partial(_text, source.data, line),
        tuple(refused),
        choice.notes,
    )


class _Coder:
    """Codes for the cells of a column of words, chunk by chunk."""

    def __init__(self) -> None:
        self._place: dict[Any, int] = {None: 0}
        self._codes: list[Codes] = []

    def add(self, cells: list[Any]) -> None:
        if cells.count(None) == len(cells):
            self._codes.append(np.zeros(len(cells), np.int32))
            return
        for cell in set(cells) - self._place.keys():
            self._place[cell] = len(self._place)
        codes = map(self._place.__getitem__, cells)
        self._codes.append(np.fromiter(codes, np.int32, len(cells)))

    def words(self) -> Words:
        """`sorted_words` takes the order in which cells were met out of the result."""
        return sorted_words(np.concatenate(self._codes), [spelling(cell) for cell in self._place])


def _names(data: bytes) -> tuple[list[str], int]:
    """Keys of the first objects, and the line of the first."""
    names: dict[str, None] = {}
    first_line = 0
    for count, (number, text) in enumerate(_lines(data)):
        if count == _SAMPLE_ROWS:
            break
        row = _object(text)
        if row is not None:
            names |= dict.fromkeys(row)
            first_line = first_line or number
    return list(names), first_line


def _decoder(numbers: Mapping[str, str], words: Mapping[str, str]) -> msgspec.json.Decoder[Any]:
    """A decoder of rows whose attributes have our names; other keys are skipped."""
    fields: list[Any] = [(name, float | None, _MISSING) for name in numbers]
    fields += [(name, str | int | float | bool | None, _MISSING) for name in words]
    row = msgspec.defstruct("Row", fields, rename={**numbers, **words}, gc=False)
    return msgspec.json.Decoder(row)


def _chunks(data: bytes) -> Iterator[tuple[int, bytes, int]]:
    """Yield (number of the first line, whole lines of about a megabyte, how many lines)."""
    start, line = 0, 1
    while start < len(data):
        end = data.find(b"\n", start + _CHUNK)
        chunk = data[start : len(data) if end < 0 else end + 1]
        count = chunk.count(b"\n") + (not chunk.endswith(b"\n"))
        yield line, chunk, count
        start += len(chunk)
        line += count


def _lines(data: bytes) -> Iterator[tuple[int, bytes]]:
    """Yield (line number, text) of lines that are neither blank nor a comment."""
    start, number = 0, 0
    while start < len(data):
        end = data.find(b"\n", start)
        end = len(data) if end < 0 else end
        number += 1
        text = data[start:end].strip()
        if text and not text.startswith(b"#"):
            yield number, text
        start = end + 1


def _decode_fast(decoder: msgspec.json.Decoder[Any], chunk: bytes, count: int) -> list[Any] | None:
    """All rows, or None if some line is not one good row."""
    try:
        rows = decoder.decode_lines(chunk)
    except msgspec.DecodeError:
        return None
    return rows if len(rows) == count else None


def _decode_careful(
    decoder: msgspec.json.Decoder[Any],
    numbers: Mapping[str, str],
    words: Mapping[str, str],
    chunk: bytes,
    first: int,
    refused: list[Rejection],
) -> tuple[list[Any], Ints]:
    """Line by line; a line that is no object is refused, a cell of the wrong type marked."""
    rows, lines = [], []
    for number, text in _lines(chunk):
        try:
            row = decoder.decode(text)
        except msgspec.DecodeError:
            cells = _object(text)
            if cells is None:
                shown = text.decode("utf-8", "replace")
                refused.append(Rejection(first + number - 1, "", "not a JSON object", shown))
                continue
            row = decoder.type(
                **{name: _number_cell(cells.get(key)) for name, key in numbers.items()},
                **{name: _word_cell(cells.get(key)) for name, key in words.items()},
            )
        rows.append(row)
        lines.append(first + number - 1)
    return rows, np.array(lines, dtype=np.int64)


def _object(text: bytes) -> dict[str, Any] | None:
    """The standard library also reads NaN and Infinity, which are refused by name later."""
    try:
        value = json.loads(text)
    except (ValueError, RecursionError):
        return None
    return value if isinstance(value, dict) else None


def _number_cell(cell: Any) -> Any:
    if cell is None or (isinstance(cell, str) and not cell.strip()):
        return _MISSING
    if isinstance(cell, bool) or not isinstance(cell, (int, float)):
        return _UNREADABLE
    try:
        return float(cell)
    except OverflowError:
        return float("inf")


def _word_cell(cell: Any) -> Any:
    return json.dumps(cell) if isinstance(cell, (list, dict)) else cell


def _numbers(cells: list[Any], *, plain: bool) -> Numbers:
    if cells.count(None) == len(cells):
        return Numbers(np.full(len(cells), np.nan), np.ones(len(cells), bool))
    if plain:
        values = np.array(cells, dtype=np.float64)  # None becomes NaN, JSON has no NaN
        missing = np.isnan(values)
        return Numbers(values, missing if missing.any() else None)
    missing = np.array([cell is _MISSING for cell in cells], dtype=bool)
    unreadable = np.array([cell is _UNREADABLE for cell in cells], dtype=bool)
    values = np.array([c if isinstance(c, float) else np.nan for c in cells], dtype=np.float64)
    return Numbers(values, missing, unreadable)


def _joined(parts: Sequence[Numbers]) -> Numbers:
    """One column from those of the chunks."""
    return Numbers(
        np.concatenate([part.values for part in parts]),
        _joined_mask(parts, "missing"),
        _joined_mask(parts, "unreadable"),
    )


def _joined_mask(parts: Sequence[Numbers], name: str) -> Mask | None:
    masks: list[Mask | None] = [getattr(part, name) for part in parts]
    if all(mask is None or not mask.any() for mask in masks):
        return None
    return np.concatenate(
        [
            np.zeros(len(part.values), bool) if mask is None else mask
            for part, mask in zip(parts, masks, strict=True)
        ]
    )


def _is_empty(column: Numbers) -> bool:
    return column.missing is not None and bool(column.missing.all())


def _text(data: bytes, line: Ints, rows: Ints) -> list[str]:
    lines = data.split(b"\n")
    return [lines[k - 1].decode("utf-8", "replace").strip() for k in line[rows].tolist()]
