"""Where the rows of a text stand: byte ranges and line numbers, found the careful way.

Only needed when a file has something out of the ordinary (blank lines, comments, quoted
newlines, rows of the wrong length); an ordinary file's row k simply stands in line k + 2.
"""

from __future__ import annotations

import csv
from collections.abc import Iterator
from dataclasses import dataclass
from itertools import accumulate
from pathlib import Path

import numpy as np

from tracker.errors import InputError
from tracker.log.model import Ints
from tracker.log.table import Mask

_NEWLINE, _RETURN, _HASH = b"\n"[0], b"\r"[0], b"#"[0]
_BLANKS = np.frombuffer(b" \t\r", np.uint8)


@dataclass(frozen=True, slots=True)
class Rows:
    """Rows that are neither blank nor a comment."""

    start: Ints  # (n,) byte offset of the first character
    stop: Ints  # (n,) byte offset after the last, line end excluded
    line: Ints  # (n,) number of the first line, 1 for the first of the text
    fields: Ints  # (n,)
    comments: int = 0  # lines left out because they begin with '#'

    def pick(self, keep: Mask) -> Rows:
        return Rows(self.start[keep], self.stop[keep], self.line[keep], self.fields[keep])

    def text(self, data: bytes, rows: Ints) -> list[str]:
        return [
            data[a:b].decode("utf-8", "replace")
            for a, b in zip(self.start[rows].tolist(), self.stop[rows].tolist(), strict=True)
        ]

    def joined(self, data: bytes) -> bytes:
        """The rows alone, one after the other."""
        pairs = zip(self.start.tolist(), self.stop.tolist(), strict=True)
        return b"\n".join([data[a:b] for a, b in pairs]) + b"\n"


def find_rows(data: bytes, delimiter: str, *, path: Path) -> Rows:
    """Every row of `data`, with its place and its number of fields.

    Raises InputError for a quotation mark that is never closed.
    """
    if b'"' in data:
        return _find_quoted_rows(data, delimiter, path)
    text = np.frombuffer(data, np.uint8)
    stop = np.flatnonzero(text == _NEWLINE)
    if not data.endswith(b"\n"):
        stop = np.append(stop, len(data))
    start = np.concatenate(([0], stop[:-1] + 1)).astype(np.int64)
    line = np.arange(1, len(start) + 1)
    fields = 1 + np.diff(
        np.searchsorted(np.flatnonzero(text == ord(delimiter)), np.append(start, len(data)))
    )
    full = stop > start
    start, stop, line, fields = start[full], stop[full], line[full], fields[full]
    stop = stop - (text[stop - 1] == _RETURN)
    comment = text[start] == _HASH
    keep = (stop > start) & ~comment
    for k in np.flatnonzero(keep & np.isin(text[start], _BLANKS)).tolist():
        rest = data[start[k] : stop[k]].strip()
        comment[k] = rest.startswith(b"#")
        keep[k] = bool(rest) and not comment[k]
    return Rows(start[keep], stop[keep], line[keep], fields[keep], int(comment.sum()))


def _find_quoted_rows(data: bytes, delimiter: str, path: Path) -> Rows:
    """The same with quotes, row by row through the csv module, whose quoting rules are Arrow's."""
    lines = data.split(b"\n")
    offsets = [0, *accumulate(len(line) + 1 for line in lines)]
    position = 0  # lines handed out so far
    between_rows = True
    first = 0  # index of the row's first line
    comments = 0

    def feed() -> Iterator[str]:
        nonlocal position, between_rows, first, comments
        for position, raw in enumerate(lines, start=1):
            if between_rows:
                bare = raw.strip()
                if not bare or bare.startswith(b"#"):
                    comments += bare.startswith(b"#")
                    continue
                first = position - 1
                between_rows = False
            # The line end is given back only within quotes, where it belongs to the value.
            yield raw.decode("utf-8", "replace").removesuffix("\r") + "\n"

    found: list[tuple[int, int, int, int]] = []
    reader = csv.reader(feed(), delimiter=delimiter, strict=False)
    try:
        for cells in reader:
            stop = offsets[position] - 1
            stop -= lines[position - 1].endswith(b"\r")
            found.append((offsets[first], stop, first + 1, len(cells)))
            between_rows = True
    except csv.Error:  # a field beyond the csv module's limit: everything after a lone quote
        raise _never_closed(path, first + 1) from None
    if found and _is_open(data[found[-1][0] :], delimiter):
        raise _never_closed(path, found[-1][2])
    table = np.array(found, dtype=np.int64).reshape(-1, 4)
    return Rows(table[:, 0], table[:, 1], table[:, 2], table[:, 3], comments)


def _is_open(row: bytes, delimiter: str) -> bool:
    """Whether the text ends within quotes."""
    try:
        list(csv.reader([row.decode("utf-8", "replace")], delimiter=delimiter, strict=True))
    except csv.Error as error:
        return "unexpected end" in str(error)
    return False


def _never_closed(path: Path, line: int) -> InputError:
    return InputError(
        "a quotation mark in this row is never closed", path=path, line=line,
        remedy='Close it, or write "" for a quotation mark within quotes.',
    )  # fmt: skip
