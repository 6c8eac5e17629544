"""What every format reader hands over: columns under our names, not yet judged."""

from __future__ import annotations

import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from tracker.log.model import Codes, Floats, Ints, Kind, Rejection

Mask = NDArray[np.bool_]


@dataclass(frozen=True, slots=True)
class Numbers:
    """A column of numbers. `values` is NaN where a cell is `missing` or `unreadable`."""

    values: Floats  # (n,)
    missing: Mask | None = None  # (n,) or None when nothing is missing
    unreadable: Mask | None = None  # (n,) text where a number should be, or None


@dataclass(frozen=True, slots=True)
class Words:
    """A column of text or codes: ``words[code[i]]``, words sorted and distinct, -1 for none."""

    code: Codes  # (n,)
    words: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class Table:
    """The rows of a file that have the right number of fields.

    `text_of` gives the original text of rows by index; `refused` are rows that could not be
    taken apart at all.
    """

    format: str
    kind: Kind
    numbers: dict[str, Numbers]
    words: dict[str, Words]
    line: Ints  # (n,) line, or row number where a format has no lines
    text_of: Callable[[Ints], list[str]]
    refused: tuple[Rejection, ...] = ()
    notes: tuple[str, ...] = field(default=())

    def __len__(self) -> int:
        return len(self.line)


def words_from_arrow(column: Any) -> Words:
    """Words from an Arrow array (chunked or not) of strings, dictionary-coded or plain."""
    import pyarrow as pa

    if isinstance(column, pa.ChunkedArray):
        if column.num_chunks == 0:
            return Words(np.empty(0, np.int32), ())
        column = column.unify_dictionaries().combine_chunks()
    if not pa.types.is_dictionary(column.type):
        column = column.dictionary_encode()
    code = column.indices.fill_null(-1).to_numpy(zero_copy_only=False)
    return sorted_words(code, column.dictionary.to_pylist())


def sorted_words(code: NDArray[Any], words: Sequence[str | None]) -> Words:
    """Trim, merge and sort the words so that codes do not depend on the order of the rows."""
    trimmed = [(word or "").strip() for word in words]
    distinct = sorted({word for word in trimmed if word})
    rank = {word: k for k, word in enumerate(distinct)}
    # The last entry serves code -1.
    new = np.array([*(rank.get(word, -1) for word in trimmed), -1], dtype=np.int32)
    return Words(new[code], tuple(distinct))


def spelling(cell: Any) -> str | None:
    """A plain value as a word: text as it is, 7.0 and 7 both as '7', True as 'true'."""
    if cell is None:
        return None
    if isinstance(cell, bool):
        return "true" if cell else "false"
    if isinstance(cell, float) and cell.is_integer():
        return str(int(cell))
    return str(cell)


def numbers_from_arrow(column: Any) -> Numbers:
    """Numbers from an Arrow column of doubles; nulls are missing cells."""
    missing = None
    if column.null_count:
        missing = column.is_null().to_numpy(zero_copy_only=False)
    return Numbers(np.asarray(column.to_numpy(), dtype=np.float64), missing)


def numbers_from_text(column: Any, *, decimal_point: str = ".") -> Numbers:
    """Numbers from an Arrow column of strings, cell by cell where a cell is bad."""
    import pyarrow as pa
    import pyarrow.compute as pc

    text = pc.utf8_trim_whitespace(column)
    missing = pc.fill_null(pc.equal(text, ""), True)
    pattern = _NUMBER.replace(r"\.", re.escape(decimal_point))
    fine = pc.fill_null(pc.match_substring_regex(text, pattern), False)
    if decimal_point != ".":
        text = pc.replace_substring(text, decimal_point, ".")
    values = pc.cast(pc.if_else(fine, text, pa.scalar(None, pa.string())), pa.float64())
    missing_cells = _mask(missing)
    unreadable = ~_mask(fine) & ~missing_cells
    return Numbers(
        np.asarray(values.to_numpy(), dtype=np.float64),
        missing_cells if missing_cells.any() else None,
        unreadable if unreadable.any() else None,
    )


# NaN and infinity are numbers to the reader and refused later, with a reason of their own.
_NUMBER = r"^(?i:[+-]?(?:(?:\d+\.?\d*|\.\d+)(?:e[+-]?\d+)?|nan|inf|infinity))$"


def _mask(column: Any) -> Mask:
    return np.asarray(column.to_numpy(zero_copy_only=False), dtype=bool)
