"""Tell a file's format from its content, whatever its name says, and read it."""

from __future__ import annotations

from collections.abc import Callable, Mapping

from tracker.errors import InputError, UsageError
from tracker.log import benchmark, delimited, ndjson, parquet
from tracker.log.columns import Role
from tracker.log.source import Source
from tracker.log.table import Table

Reader = Callable[[Source, Mapping[str, str], Role], Table]

READERS: dict[str, Reader] = {
    delimited.NAME: delimited.read,
    parquet.NAME: parquet.read,
    ndjson.NAME: ndjson.read,
    benchmark.NAME: benchmark.read,
}
FORMATS = tuple(READERS)


def read_table(
    source: Source, *, role: Role, columns: Mapping[str, str] | None, format: str | None
) -> Table:
    """Read a file by its format: the one that was asked for, else the one its content shows.

    Raises UsageError for an unknown format, InputError for content that fits none.
    """
    if format is not None and format not in READERS:
        raise UsageError(
            f"--format: there is no format {format!r}; the formats are {', '.join(FORMATS)} "
            "(csv also reads tabs and semicolons)"
        )
    if format is None:
        format = recognise(source)
    elif source.is_parquet != (format == parquet.NAME):
        actual = "is a" if source.is_parquet else "is not a"
        raise InputError(
            f"this file {actual} Parquet file", path=source.path, remedy="Leave out --format."
        )
    return READERS[format](source, columns or {}, role)


def recognise(source: Source) -> str:
    """The name of the format of `source`."""
    if source.is_parquet:
        return parquet.NAME
    header = delimited.find_header(source.data)
    if header is None:
        raise InputError("there is no header and no row in this file", path=source.path)
    if header.cells[0].lstrip()[:1] in ("{", "["):
        _check_first_object(source, header)
        return ndjson.NAME
    if not header.numeric:
        return delimited.NAME
    rows, _ = benchmark.sample_rows(source)
    if benchmark.fits(rows):
        return benchmark.NAME
    raise InputError(
        "the first row is not a header, and the rows are not in the public benchmark text layout",
        path=source.path,
        line=header.line,
        found=header.delimiter.join(header.cells)[:80],
        remedy="Put a header above them, such as frame,left,top,width,height,score.",
    )


def _check_first_object(source: Source, header: delimited.Header) -> None:
    """Raise InputError if this is JSON of another shape than one object a line."""
    start = source.data.rfind(b"\n", 0, header.stop - 1) + 1
    first = source.data[start : header.stop].strip()
    if first.startswith(b"{") and first.endswith(b"}"):
        return  # if it is broken nevertheless, the reader refuses it by its line
    raise InputError(
        "this is a JSON document, not one object a line",
        path=source.path,
        line=header.line,
        found=first[:60].decode("utf-8", "replace"),
        remedy='Write one object a line, such as {"frame": 1, "x": 2.5, "y": 0.5}.',
    )
