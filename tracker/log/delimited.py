"""CSV, TSV and semicolon-separated text.

Two ways through a file. The fast one lets Arrow parse typed columns and only counts lines. If
anything is out of the ordinary the careful one finds each row's place first, refuses rows of
the wrong length, and reads numbers as text where some cell is none.
"""

from __future__ import annotations

import csv
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np

from tracker.errors import InputError
from tracker.log.columns import Role, choose_columns
from tracker.log.lines import Rows, find_rows
from tracker.log.model import Ints, Kind, Rejection
from tracker.log.source import Source
from tracker.log.table import (
    Numbers,
    Table,
    Words,
    numbers_from_arrow,
    numbers_from_text,
    words_from_arrow,
)

NAME = "csv"
DELIMITERS = ",;\t"
_SAMPLE_ROWS = 100
_BLOCK = 1 << 20  # Arrow's own default; a row must fit into a block


def read(source: Source, mapping: Mapping[str, str], role: Role) -> Table:
    """Read delimited text whose first row is a header.

    Raises InputError if the header does not fit the role.
    """
    header = find_header(source.data)
    if header is None:
        raise InputError("there is no header and no row in this file", path=source.path)
    names = [name.strip() for name in header.cells]
    choice = choose_columns(names, mapping, role=role, path=source.path, line=header.line)
    body = Body(
        source=source,
        offset=header.stop,
        lines_before=header.line,
        delimiter=header.delimiter,
        width=len(names),
        numbers={ours: names.index(theirs) for ours, theirs in choice.numbers.items()},
        words={ours: names.index(theirs) for ours, theirs in choice.words.items()},
    )
    return read_body(body, format=NAME, kind=choice.kind, notes=choice.notes)


@dataclass(frozen=True, slots=True)
class Header:
    """The first row, be it a header or not.

    `stop` is the byte offset of the line after it; `delimiter` is a blank where only blanks
    separate. `numeric` says that at least half of the cells are numbers.
    """

    cells: list[str]
    delimiter: str
    line: int
    stop: int

    @property
    def numeric(self) -> bool:
        return 2 * sum(map(is_number, self.cells)) >= len(self.cells)


def find_header(data: bytes) -> Header | None:
    """The first line that is neither blank nor a comment.

    A comment right above rows of numbers that has a word for each of their cells is taken for
    the header that it is.
    """
    offset, line = 0, 0
    comment: Header | None = None
    while offset < len(data):
        end = data.find(b"\n", offset)
        offset, start = (len(data) if end < 0 else end + 1), offset
        line += 1
        text = data[start:offset].decode("utf-8", "replace").strip("\r\n")
        bare = text.strip()
        if bare.startswith("#"):
            comment = Header(*_cells_of(bare.lstrip("# ")), line, offset)
        elif bare:
            row = Header(*_cells_of(text), line, offset)
            if comment and len(comment.cells) == len(row.cells) > 1:
                return comment if row.numeric and not comment.numeric else row
            return row
    return None


def _cells_of(text: str) -> tuple[list[str], str]:
    delimiter = max(DELIMITERS, key=lambda mark: len(split(text, mark)))
    cells = split(text, delimiter)
    if len(cells) == 1 and len(text.split()) > 1:
        return text.split(), " "
    return cells, delimiter


def split(line: str, delimiter: str) -> list[str]:
    """One line's cells; an unclosed quotation mark ends with the line."""
    if delimiter == " ":
        return line.split()
    try:
        return next(csv.reader([line], delimiter=delimiter), [])
    except csv.Error:  # a cell beyond the csv module's limit of 131,072 characters
        return line.split(delimiter)


def is_number(cell: str) -> bool:
    """Whether a cell reads as a number."""
    try:
        float(cell)
    except ValueError:
        return False
    return True


@dataclass(frozen=True)
class Body:
    """Rows below a header, or all rows of a file without one, and which columns to read."""

    source: Source
    offset: int  # byte offset of the first row
    lines_before: int
    delimiter: str
    width: int  # fields in a row
    numbers: Mapping[str, int]  # our name → field, counted from 0
    words: Mapping[str, int]

    @cached_property
    def data(self) -> bytes:
        """The rows; where blanks separate, one blank between cells and none at the ends."""
        data = self.source.data[self.offset :] if self.offset else self.source.data
        if self.delimiter == " ":
            data = data.translate(bytes.maketrans(b"\t\r", b"  "))
            while b"  " in data:
                data = data.replace(b"  ", b" ")
            data = data.replace(b" \n", b"\n").replace(b"\n ", b"\n").strip(b" ")
        return data

    @cached_property
    def rows(self) -> Rows:
        return find_rows(self.data, self.delimiter, path=self.source.path)

    def text(self, chosen: Ints, rows: Rows | None = None) -> list[str]:
        """The original text of some of the rows (of all rows, unless `rows` are given)."""
        rows = self.rows if rows is None else rows
        if self.delimiter != " ":
            return rows.text(self.data, chosen)
        lines = self.source.data[self.offset :].split(b"\n")
        return [
            lines[line - 1].decode("utf-8", "replace").rstrip("\r")
            for line in rows.line[chosen].tolist()
        ]

    @cached_property
    def decimal_point(self) -> str:
        """A comma where semicolons separate, some number has a comma and none has a point."""
        if self.delimiter != ";":
            return "."
        sample = self.data[:_BLOCK].decode("utf-8", "replace").split("\n")[:_SAMPLE_ROWS]
        cells = [split(line, ";") for line in sample]
        numbers = [
            row[field]
            for row in cells
            for field in self.numbers.values()
            if field < len(row) and row[field].strip("+-0123456789., ") == ""
        ]
        has_comma = any("," in text for text in numbers)
        return "," if has_comma and not any("." in text for text in numbers) else "."


def read_body(body: Body, *, format: str, kind: Kind, notes: Sequence[str] = ()) -> Table:
    """Read the rows, fast if they let us, carefully if not."""
    notes = list(notes)
    if body.decimal_point == ",":
        notes.append("numbers are written with a decimal comma")
    fast = _read_fast(body)
    if fast is not None:
        numbers, words, count = fast
        line = np.arange(1, count + 1, dtype=np.int64) + body.lines_before
        return Table(format, kind, numbers, words, line, body.text, notes=tuple(notes))
    rows = body.rows
    if rows.comments:
        lines = "1 comment line" if rows.comments == 1 else f"{rows.comments} comment lines"
        notes.append(f"{lines} (beginning with '#') left out")
    right = rows.fields == body.width
    refused = tuple(
        Rejection(int(line) + body.lines_before, "", _wrong_length(body.width, int(fields)), text)
        for line, fields, text in zip(
            rows.line[~right],
            rows.fields[~right],
            body.text(np.flatnonzero(~right)),
            strict=True,
        )
    )
    rows = rows.pick(right)
    numbers, words = _read_careful(body, rows)
    return Table(
        format,
        kind,
        numbers,
        words,
        rows.line + body.lines_before,
        lambda chosen: body.text(chosen, rows),
        refused,
        tuple(notes),
    )


def _read_fast(body: Body) -> tuple[dict[str, Numbers], dict[str, Words], int] | None:
    """Typed columns and the number of rows, or None if a row needs a closer look."""
    import pyarrow as pa

    if 0 not in body.numbers.values() and b"#" in body.source.data:
        return None  # a comment could pass for a row where the first cell may be text
    irregular = False

    def skip(_row: Any) -> str:
        nonlocal irregular
        irregular = True
        return "skip"

    try:
        buffer = pa.py_buffer(body.source.data).slice(body.offset)  # no copy
        if body.delimiter == " ":
            buffer = pa.py_buffer(body.data)
        table = _arrow(body, buffer, pa.float64(), skip=skip)
    except pa.ArrowInvalid:
        return None
    if irregular or _count_lines(buffer) != len(table):
        return None
    return (
        {name: numbers_from_arrow(table[name]) for name in body.numbers},
        {name: words_from_arrow(table[name]) for name in body.words},
        len(table),
    )


def _read_careful(body: Body, rows: Rows) -> tuple[dict[str, Numbers], dict[str, Words]]:
    """The same from rows that are known to have the right length; numbers go through text."""
    import pyarrow as pa

    if not len(rows.start):
        nothing = np.empty(0)
        return (
            {name: Numbers(nothing) for name in body.numbers},
            {name: Words(np.empty(0, np.int32), ()) for name in body.words},
        )
    buffer = pa.py_buffer(rows.joined(body.data))
    block = max(_BLOCK, 2 * int((rows.stop - rows.start).max()))
    number = pa.float64()
    try:
        table = _arrow(body, buffer, number, block=block)
    except pa.ArrowInvalid:
        number = pa.string()
        try:
            table = _arrow(body, buffer, number, block=block)
        except pa.ArrowInvalid as error:
            raise InputError(f"cannot be taken apart: {error}", path=body.source.path) from None
    if len(table) != len(rows.start):
        raise InputError(
            f"{len(rows.start)} rows were found but {len(table)} could be taken apart",
            path=body.source.path,
            remedy="Look for stray quotation marks.",
        )
    words = {name: words_from_arrow(table[name]) for name in body.words}
    if number == pa.float64():
        return {name: numbers_from_arrow(table[name]) for name in body.numbers}, words
    point = body.decimal_point
    return {
        name: numbers_from_text(table[name], decimal_point=point) for name in body.numbers
    }, words


def _count_lines(buffer: Any) -> int:
    """Line ends, and a last line without one. In blocks, this is faster than bytes.count."""
    text = np.frombuffer(buffer, np.uint8)
    ends = sum(
        np.count_nonzero(text[k : k + _BLOCK] == ord("\n")) for k in range(0, len(text), _BLOCK)
    )
    return int(ends) + bool(len(text) and text[-1] != ord("\n"))


def _arrow(body: Body, buffer: Any, number: Any, *, skip: Any = None, block: int = _BLOCK) -> Any:
    """Parse a buffer with Arrow: columns under our names, numbers as the type given."""
    import pyarrow as pa
    from pyarrow import csv as arrow_csv

    names = [f"field {k}" for k in range(body.width)]
    for ours, field in (*body.numbers.items(), *body.words.items()):
        names[field] = ours
    types = dict.fromkeys(body.numbers, number)
    types |= dict.fromkeys(body.words, pa.dictionary(pa.int32(), pa.string()))
    return arrow_csv.read_csv(
        pa.BufferReader(buffer),
        read_options=arrow_csv.ReadOptions(column_names=names, block_size=block),
        parse_options=arrow_csv.ParseOptions(
            delimiter=body.delimiter,
            newlines_in_values=b'"' in body.source.data,
            invalid_row_handler=skip,
        ),
        convert_options=arrow_csv.ConvertOptions(
            column_types=types,
            include_columns=[*body.numbers, *body.words],
            null_values=[""],
            strings_can_be_null=True,
            decimal_point=body.decimal_point,
        ),
    )


def _wrong_length(expected: int, found: int) -> str:
    return f"expected {expected} fields, found {found}"
