"""The public benchmark text layout: no header, one box a row, columns known by their place.

    frame, id, left, top, width, height, confidence[, -1, -1, -1]    results and detections
    frame, id, left, top, width, height, flag, class, visibility     truth

Detections have -1 as their id. Columns after the confidence (a position in the world, if not
-1) are not used. Blanks instead of commas are read as well.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping

from tracker.errors import InputError, UsageError
from tracker.log.columns import Role
from tracker.log.delimited import Body, find_header, is_number, read_body, split
from tracker.log.model import Kind
from tracker.log.source import Source
from tracker.log.table import Table

NAME = "benchmark"
FIRST_COLUMNS = ("frame", "id", "left", "top", "width", "height")
TRUTH_WIDTH = 9
_SAMPLE_BYTES = 1 << 18
_SAMPLE_ROWS = 200


def sample_rows(source: Source) -> tuple[list[list[str]], str]:
    """Cells of the first rows, and the delimiter."""
    header = find_header(source.data)
    if header is None:
        return [], ","
    lines = source.data[:_SAMPLE_BYTES].decode("utf-8", "replace").split("\n")
    lines = [line for line in lines if line.strip() and not line.lstrip().startswith("#")]
    return [split(line, header.delimiter) for line in lines[:_SAMPLE_ROWS]], header.delimiter


def fits(rows: list[list[str]]) -> bool:
    """Whether most rows have six numbers or more, with a whole frame number and identity."""
    good = sum(
        len(row) >= len(FIRST_COLUMNS)
        and all(map(is_number, row[:6]))
        and all(float(cell).is_integer() for cell in row[:2])
        for row in rows
    )
    return 2 * good > len(rows)


def read(source: Source, mapping: Mapping[str, str], role: Role) -> Table:
    """Read the layout; columns cannot be mapped, because it names none."""
    if mapping:
        raise UsageError("--columns: the public benchmark text layout has no column names to map")
    rows, delimiter = sample_rows(source)
    width = Counter(map(len, rows)).most_common(1)[0][0] if rows else 0
    if width < len(FIRST_COLUMNS):
        raise InputError(
            "the public benchmark text layout has at least 6 numbers in a row: "
            "frame, id, left, top, width, height",
            path=source.path,
            found=delimiter.join(rows[0])[:80] if rows else "nothing",
        )
    numbers = {"frame": 0, "left": 2, "top": 3, "width": 4, "height": 5}
    words = {"id": 1}
    notes: list[str] = []
    if width == TRUTH_WIDTH and _has_class(rows):
        words |= {"label": 7}
        if role is Role.TRUTH:
            words |= {"scored": 6}
            numbers |= {"visibility": 8}
        else:
            notes.append("the rows have flag, class and visibility as truth has, and no score")
    elif width > len(FIRST_COLUMNS):
        if role is Role.TRUTH:
            words |= {"scored": 6}
        else:
            numbers |= {"score": 6}
    body = Body(
        source=source,
        offset=0,
        lines_before=0,
        delimiter=delimiter,
        width=width,
        numbers=numbers,
        words=words,
    )
    return read_body(body, format=NAME, kind=Kind.BOX, notes=notes)


def _has_class(rows: list[list[str]]) -> bool:
    return any(len(row) > 7 and is_number(row[7]) and float(row[7]) > 0 for row in rows)
