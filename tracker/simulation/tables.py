"""Columns of a CSV file, rounded once so that memory and file hold the same numbers."""

from __future__ import annotations

import io
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from tracker.log.model import Codes, Floats, Ints

SCORE_DECIMALS = 3
SHARE_DECIMALS = 2


class Words(NamedTuple):
    """A column of text: ``words[code[i]]``."""

    code: Codes
    words: tuple[str, ...]


Column = Floats | Ints | NDArray[np.float32] | Words
Columns = dict[str, Column]


def rounded(values: Floats, decimals: int) -> Floats:
    """Rounded, and without a negative zero."""
    return np.asarray(np.round(values, decimals) + 0.0, dtype=np.float64)


def named(names: tuple[str, ...], values: Floats | NDArray[np.float32]) -> Columns:
    """The columns of an (n, d) array by name."""
    return {name: values[:, k] for k, name in enumerate(names)}


def csv_bytes(columns: Columns) -> bytes:
    """A comma-separated table with a header; numbers in their shortest exact form."""
    import pyarrow as pa
    import pyarrow.csv

    table = pa.table({name: _array(column) for name, column in columns.items()})
    sink = io.BytesIO()
    sink.write((",".join(columns) + "\n").encode())
    # No name or label of ours needs quotes.
    options = pyarrow.csv.WriteOptions(include_header=False, quoting_style="none")
    pyarrow.csv.write_csv(table, sink, options)
    return sink.getvalue()


def _array(column: Column) -> object:
    import pyarrow as pa

    if isinstance(column, Words):
        words = pa.DictionaryArray.from_arrays(pa.array(column.code), pa.array(column.words))
        return words.cast(pa.string())
    return pa.array(column)
