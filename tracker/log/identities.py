"""What truth and track files share: who each row is, and that nobody is twice in a frame."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

import numpy as np

from tracker.errors import InputError
from tracker.log.columns import IDENTITY, Role
from tracker.log.model import Floats, Ints
from tracker.log.sieve import MISSING, Sieve
from tracker.log.table import Mask, Words
from tracker.log.timeline import check_pairs, frames_of

_PREFERRED = {Role.TRUTH: IDENTITY, Role.TRACKS: ("track", "object", "id")}


@dataclass(frozen=True, slots=True)
class IdentifiedRows:
    """The kept rows of a truth or track file, ordered by (frame, identity).

    `row` indexes the table; the other arrays are aligned with it. `identity` holds dense codes
    into `names`, which are whole numbers in order of size or text in alphabetical order.
    """

    row: Ints
    frame: Ints
    time: Floats | None
    identity: Ints
    names: tuple[str, ...]


def check_identified(sieve: Sieve, path: Path, role: Role) -> Words:
    """Judge the rows of a truth or track file and return its identities.

    Raises InputError if the file has no identities.
    """
    column = next((name for name in _PREFERRED[role] if name in sieve.table.words), None)
    found = None if column is None else _in_order(sieve.table.words[column])
    if column is None or found is None or (len(found.code) and not _any_named(found)):
        raise InputError(
            f"this {role.value} file has no identities",
            path=path,
            column=column,
            remedy=f"It needs a column '{_PREFERRED[role][0]}' that says who each row is; a "
            "detection log has none.",
        )
    sieve.measurement()
    sieve.reject(found.code < 0, column, MISSING)
    negative = np.array([_is_negative(word) for word in found.words] + [False])
    sieve.reject(negative[found.code], column, "negative identity")
    check_pairs(sieve)
    _reject_twins(sieve, found, column)
    return found


def identified_rows(sieve: Sieve, identities: Words) -> IdentifiedRows:
    """The kept rows in their final order."""
    row = np.flatnonzero(sieve.keep)
    frame, time = frames_of(sieve)
    present, identity = np.unique(identities.code[row], return_inverse=True)
    order = np.lexsort((identity, frame))
    return IdentifiedRows(
        row[order],
        frame[order],
        None if time is None else time[order],
        identity[order].astype(np.int64),
        tuple(identities.words[k] for k in present.tolist()),
    )


def flags(sieve: Sieve, column: str) -> Mask:
    """(n,) truth values of a column of 1 and 0 (or true and false); True without the column.

    Rows that say something else are rejected; a missing cell is True.
    """
    words = sieve.table.words.get(column)
    if words is None:
        return np.ones(len(sieve.table), bool)
    values = [_flag(word) for word in words.words]
    unclear = np.array([value is None for value in values] + [False])
    sieve.reject(unclear[words.code], column, "must be 1 or 0")
    return np.array([value is not False for value in values] + [True])[words.code]


def optional_numbers(sieve: Sieve, column: str) -> Floats:
    """(n,) values of a column that may be absent or have gaps: NaN there."""
    if column not in sieve.table.numbers:
        return np.full(len(sieve.table), np.nan)
    sieve.numbers(column, optional=True)
    return sieve.table.numbers[column].values


def _in_order(words: Words) -> Words:
    """Identities that are all whole numbers, ordered by size, '7.0' and '7' being one."""
    numbers = [number for word in words.words if (number := _whole_number(word)) is not None]
    if len(numbers) < len(words.words):
        return words
    distinct = sorted(set(numbers))
    rank = {number: k for k, number in enumerate(distinct)}
    new = np.array([*(rank[number] for number in numbers), -1], dtype=np.int32)
    return Words(new[words.code], tuple(map(str, distinct)))


def _whole_number(word: str) -> int | None:
    """The number that a word is, None if it is no whole one.

    By way of int where that reads it: a float would take ids beyond 2**53 for their neighbours.
    """
    try:
        return int(word)
    except ValueError:
        pass
    try:
        number = float(word)
    except ValueError:
        return None
    return int(number) if number.is_integer() else None


def _any_named(words: Words) -> bool:
    return any(not _is_negative(word) for word in words.words)


def _is_negative(word: str) -> bool:
    try:
        return float(word) < 0
    except ValueError:
        return False


def _flag(word: str) -> bool | None:
    if word.lower() in ("true", "false"):
        return word.lower() == "true"
    try:
        return float(word) != 0
    except ValueError:
        return None


def _reject_twins(sieve: Sieve, identities: Words, column: str) -> None:
    """Reject rows whose identity is in their frame already."""
    row = np.flatnonzero(sieve.keep)
    frame, _ = frames_of(sieve)
    code = identities.code[row]
    order = np.lexsort((code, frame))
    same = (np.diff(frame[order]) == 0) & (np.diff(code[order]) == 0)
    if not same.any():
        return
    reasons: dict[int, str] = {}
    first = 0
    for k in np.flatnonzero(same).tolist():
        if not (k and same[k - 1]):
            first = order[k]
        who = identities.words[code[first]]
        reasons[int(row[order[k + 1]])] = (
            f"'{who}' is in this frame already ({sieve.line_of(row[first])})"
        )
    sieve.reject_rows(np.array(sorted(reasons), dtype=np.int64), column, reasons.__getitem__)
