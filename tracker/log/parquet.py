"""Apache Parquet: the same column names; a row's number (from 1) stands for its line."""

from __future__ import annotations

from collections.abc import Mapping
from contextlib import suppress
from functools import partial
from typing import Any

import numpy as np

from tracker.errors import InputError
from tracker.log.columns import Role, choose_columns
from tracker.log.model import Ints
from tracker.log.source import Source
from tracker.log.table import (
    Numbers,
    Table,
    Words,
    numbers_from_arrow,
    numbers_from_text,
    words_from_arrow,
)

NAME = "parquet"


def read(source: Source, mapping: Mapping[str, str], role: Role) -> Table:
    """Read the needed columns; numbers may be of any numeric type, or text that spells them.

    Raises InputError for a damaged file, or columns that do not fit the role.
    """
    import pyarrow as pa
    import pyarrow.parquet as pq

    try:
        file = pq.ParquetFile(pa.BufferReader(source.data))
        names = file.schema_arrow.names
        choice = choose_columns(names, mapping, role=role, path=source.path, line=None)
        table = file.read(columns=[*choice.numbers.values(), *choice.words.values()])
    except (pa.ArrowException, OSError) as error:
        raise InputError(
            f"not a readable Parquet file: {error}",
            path=source.path,
            remedy="It may have been cut short; write it again.",
        ) from None
    return Table(
        NAME,
        choice.kind,
        {ours: _numbers(table[theirs], theirs, source) for ours, theirs in choice.numbers.items()},
        {ours: _words(table[theirs], theirs, source) for ours, theirs in choice.words.items()},
        np.arange(1, len(table) + 1, dtype=np.int64),
        partial(_text, table),
        notes=choice.notes,
    )


def _numbers(column: Any, name: str, source: Source) -> Numbers:
    import pyarrow as pa

    kind = column.type
    if pa.types.is_dictionary(kind):
        column = column.cast(kind.value_type)
        kind = column.type
    if pa.types.is_null(kind):
        return Numbers(np.full(len(column), np.nan), np.ones(len(column), bool))
    if pa.types.is_string(kind) or pa.types.is_large_string(kind):
        return numbers_from_text(column.cast(pa.string()))
    if not (pa.types.is_integer(kind) or pa.types.is_floating(kind) or pa.types.is_decimal(kind)):
        raise InputError(
            "this column should hold numbers", path=source.path, column=name, found=str(kind),
            remedy="Write it as integers or doubles (time: seconds).",
        )  # fmt: skip
    return numbers_from_arrow(column.cast(pa.float64(), safe=False))


def _words(column: Any, name: str, source: Source) -> Words:
    import pyarrow as pa
    import pyarrow.compute as pc

    kind = column.type
    if pa.types.is_dictionary(kind):
        column = column.cast(kind.value_type)
        kind = column.type
    if pa.types.is_null(kind):
        return Words(np.full(len(column), -1, np.int32), ())
    if pa.types.is_floating(kind):
        # Integers with gaps often come as floats: 7.0 is the code 7.
        column = pc.if_else(pc.is_nan(column), None, column)
        with suppress(pa.ArrowInvalid):
            column = column.cast(pa.int64())
    try:
        return words_from_arrow(column.cast(pa.string()))
    except (pa.ArrowInvalid, pa.ArrowNotImplementedError):
        raise InputError(
            "this column should hold text or codes", path=source.path, column=name,
            found=str(kind), remedy="Write it as text or integers.",
        ) from None  # fmt: skip


def _text(table: Any, rows: Ints) -> list[str]:
    """Parquet has no original text: the cells that were read, as name=value."""
    return [
        ", ".join(f"{name}={value}" for name, value in row.items())
        for row in table.take(rows).to_pylist()
    ]
