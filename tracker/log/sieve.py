"""Judge rows: what is wrong with each, kept with its line, column and original text."""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from tracker.errors import InputError, RejectedRowsError
from tracker.log.model import Codes, Floats, Ints, Kind, Rejection
from tracker.log.table import Mask, Table

LARGEST = 1e12  # beyond it seconds, pixels and metres are surely in a wrong unit

MISSING = "missing value"
NOT_A_NUMBER = "not a number"
NOT_FINITE = "not a finite number"
TOO_LARGE = f"too large (the limit is {LARGEST:g}; time is in seconds)"
NOT_WHOLE = "not a whole number"
NOT_POSITIVE = "must be greater than 0"

_BLOCK = 1 << 15  # rows hashed at once, so that they stay in the processor's cache

Patterns = NDArray[np.uint64]
Reason = str | Callable[[int], str]


class Sieve:
    """Which rows of a table are kept; a row is rejected once, for the first reason found."""

    def __init__(self, table: Table) -> None:
        self.table = table
        self._keep: Mask | None = None  # None while every row is kept: most logs are clean
        self._verdicts: list[tuple[int, str, str]] = []

    @property
    def keep(self) -> Mask:
        """(n,) True for rows still kept; do not write into it."""
        return np.ones(len(self.table), bool) if self._keep is None else self._keep

    @property
    def kept(self) -> Ints | slice:
        """An index that picks the kept rows (without copying when that is all of them)."""
        return slice(None) if self._keep is None else np.flatnonzero(self._keep)

    def reject(self, bad: Mask, column: str, reason: Reason) -> None:
        """Reject rows where `bad` is True; `reason` may depend on the row's index."""
        self.reject_rows(np.flatnonzero(bad), column, reason)

    def reject_rows(self, rows: Ints, column: str, reason: Reason) -> None:
        """Reject rows by index."""
        if not len(rows):
            return
        if self._keep is None:
            self._keep = np.ones(len(self.table), bool)
        for row in rows[self._keep[rows]].tolist():
            self._verdicts.append((row, column, reason if isinstance(reason, str) else reason(row)))
        self._keep[rows] = False

    def numbers(self, name: str, *, optional: bool = False) -> None:
        """Reject rows whose cell in this column is no usable number.

        Missing cells of an optional column are kept as NaN.
        """
        column = self.table.numbers[name]
        values = column.values
        if not len(values) or (
            column.missing is None
            and column.unreadable is None
            and values.min() >= -LARGEST
            and values.max() <= LARGEST
        ):
            return
        fine = np.isfinite(values)
        if column.unreadable is not None:
            self.reject(column.unreadable, name, NOT_A_NUMBER)
            fine |= column.unreadable
        if column.missing is not None:
            if not optional:
                self.reject(column.missing, name, MISSING)
            fine |= column.missing
        self.reject(~fine, name, NOT_FINITE)
        self.reject(np.abs(np.nan_to_num(values)) > LARGEST, name, TOO_LARGE)

    def whole(self, name: str) -> None:
        """Reject rows whose number has a fraction."""
        values = self.table.numbers[name].values
        with np.errstate(invalid="ignore"):
            bad = values != np.rint(values)
        if bad.any():
            self.reject(bad, name, NOT_WHOLE)

    def positive(self, name: str) -> None:
        """Reject rows whose number is zero or negative."""
        bad = self.table.numbers[name].values <= 0
        if bad.any():
            self.reject(bad, name, NOT_POSITIVE)

    def measurement(self) -> None:
        """Check frame, time and the measurement columns of a table."""
        for name in ("frame", "time"):
            if name in self.table.numbers:
                self.numbers(name)
        if "frame" in self.table.numbers:
            self.whole("frame")
        for name in self.table.kind.columns:
            self.numbers(name)
        if self.table.kind is Kind.BOX:
            self.positive("width")
            self.positive("height")

    def line_of(self, row: int) -> str:
        """'line 12', for reasons that point at another row."""
        return f"line {int(self.table.line[row])}"

    def rejections(self) -> tuple[Rejection, ...]:
        """All rejected rows by line, those that could not be taken apart included."""
        rows = np.array([row for row, _, _ in self._verdicts], dtype=np.int64)
        texts = self.table.text_of(rows) if len(rows) else []
        found = [
            Rejection(int(self.table.line[row]), column, reason, text)
            for (row, column, reason), text in zip(self._verdicts, texts, strict=True)
        ]
        return tuple(sorted((*self.table.refused, *found), key=lambda one: one.line))


def settle(
    sieve: Sieve, path: Path, *, strict: bool, may_be_empty: bool = False
) -> tuple[Rejection, ...]:
    """The rejections of a file whose checks are done.

    may_be_empty : whether column names without a row will do.

    Raises InputError if there is no row or no row is left, RejectedRowsError if `strict` and
    any was rejected.
    """
    rejections = sieve.rejections()
    if not len(sieve.table) and not rejections and not may_be_empty:
        raise InputError("there are column names but no row", path=path)
    if rejections and not sieve.keep.any():
        counts = Counter((one.column, kind_of_reason(one.reason)) for one in rejections)
        most, count = counts.most_common(1)[0]
        first = next(one for one in rejections if (one.column, kind_of_reason(one.reason)) == most)
        rows = "the only row was" if len(rejections) == 1 else f"all {len(rejections)} rows were"
        share = f", {count} of them for this reason" if len(rejections) > 1 else ""
        raise InputError(
            f"{rows} rejected{share}: {first.reason}",
            path=path,
            line=first.line,
            column=first.column or None,
            found=first.text[:80],
        )
    if strict and rejections:
        raise RejectedRowsError(len(rejections), path=path, first=sentence(rejections[0]))
    return rejections


def sentence(rejection: Rejection) -> str:
    """A rejection as a person reads it."""
    column = f", column '{rejection.column}'" if rejection.column else ""
    return f"line {rejection.line}{column}: {rejection.reason} (found {rejection.text[:80]!r})"


def kind_of_reason(reason: str) -> str:
    """The reason without what differs from row to row, for counting."""
    head, mark, _ = reason.partition(" (")
    return head if mark else reason.partition(" of line")[0]


def find_repeats(columns: list[Floats | Ints | Codes]) -> tuple[Ints, Ints]:
    """Rows that repeat an earlier one in all columns, and the first row that each repeats.

    NaN equals NaN. Rows are hashed and the hashes sorted; only rows that share a hash are
    compared in full.
    """
    key = np.empty(len(columns[0]), np.uint64)
    for start in range(0, len(key), _BLOCK):
        block = slice(start, start + _BLOCK)
        key[block] = _hash([_bits(column[block]) for column in columns])
    ordered = np.sort(key)
    shared = np.unique(ordered[1:][ordered[1:] == ordered[:-1]])
    nothing = np.empty(0, np.int64)
    if not len(shared):
        return nothing, nothing
    first: dict[tuple[int, ...], int] = {}
    repeats, originals = [], []
    suspects = np.flatnonzero(np.isin(key, shared))
    bits = [_bits(column[suspects]).tolist() for column in columns]
    for row, *cells in zip(suspects.tolist(), *bits, strict=True):
        original = first.setdefault(tuple(cells), row)
        if original != row:
            repeats.append(row)
            originals.append(original)
    return np.array(repeats, dtype=np.int64), np.array(originals, dtype=np.int64)


def _hash(columns: list[Patterns]) -> Patterns:
    """Multiply and fold, one column after the other (Knuth, vol. 3, section 6.4)."""
    key = np.zeros(len(columns[0]), np.uint64)
    for column in columns:
        key ^= column
        key *= np.uint64(0x9E3779B97F4A7C15)  # 2^64 over the golden ratio
        key ^= key >> np.uint64(29)
    return key


def _bits(column: Floats | Ints | Codes) -> Patterns:
    """Values as 64-bit patterns, equal exactly where the values are."""
    values = np.asarray(column, dtype=np.float64) + 0.0  # -0.0 becomes 0.0
    values[np.isnan(values)] = np.nan  # one pattern for all NaN
    return values.view(np.uint64)
