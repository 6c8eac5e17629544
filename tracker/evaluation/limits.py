"""Limits that scores are held to: `idf1>=0.72`, one by one or in a TOML file."""

from __future__ import annotations

import difflib
import operator
import re
import tomllib
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from tracker.errors import InputError, UsageError
from tracker.evaluation.evaluate import Evaluation
from tracker.evaluation.scores import LIMITED, RATIOS, Scores

OVERALL = "overall"
COMPARE: dict[str, Callable[[float, float], bool]] = {
    ">=": operator.ge,
    "<=": operator.le,
    ">": operator.gt,
    "<": operator.lt,
}
_FORM = re.compile(r"\s*([A-Za-z_0-9]+)\s*(>=|<=|>|<)\s*([-+.0-9eE]+)\s*(%?)\s*")


@dataclass(frozen=True, slots=True)
class Limit:
    """One score's limit. `sequence` is None for the overall score."""

    score: str
    sense: str
    value: float
    sequence: str | None = None

    @property
    def words(self) -> str:
        return f"{self.score} {self.sense} {self.value:g}"


@dataclass(frozen=True, slots=True)
class Verdict:
    """Whether a limit was met; `found` is None where the score has no value, which fails."""

    limit: Limit
    found: float | None

    @property
    def met(self) -> bool:
        if self.found is None:
            return False
        return COMPARE[self.limit.sense](self.found, self.limit.value)

    @property
    def where(self) -> str:
        return self.limit.sequence or OVERALL

    @property
    def name(self) -> str:
        return self.limit.words

    @property
    def message(self) -> str:
        """What a report of failures says."""
        found = "has no value" if self.found is None else f"is {self.found:.6g}"
        return f"{self.limit.score} {found}, the limit is {self.limit.words}"

    def as_dict(self) -> dict[str, Any]:
        """As `margent evaluate --json` prints it."""
        return {
            "sequence": self.limit.sequence,
            "score": self.limit.score,
            "limit": f"{self.limit.sense}{self.limit.value:g}",
            "found": self.found,
            "met": self.met,
        }


def parse_limit(text: str, sequence: str | None = None, *, source: str = "--limit") -> Limit:
    """A limit from words like ``idf1>=0.72``, ``switches<=10`` or ``idf1>=72%``.

    Raises UsageError, with the likely name where the score is unknown.
    """
    match = _FORM.fullmatch(text)
    try:
        if match is None:
            raise ValueError
        score, sense, number, percent = match.groups()
        value = float(number)
    except ValueError:
        raise UsageError(
            f"{source}: a limit reads like 'idf1>=0.72' or 'switches<=10' (found {text!r})"
        ) from None
    if score not in LIMITED:
        near = difflib.get_close_matches(score.lower(), LIMITED, n=1, cutoff=0.5)
        hint = f"; did you mean '{near[0]}'?" if near else ""
        raise UsageError(f"{source}: there is no score '{score}'{hint} ({', '.join(LIMITED)})")
    if percent:
        if score not in RATIOS:
            raise UsageError(f"{source}: {score} is no ratio, so it has no percent ({text!r})")
        value /= 100.0
    if score in RATIOS and score != "motp" and value > 1.0:
        raise UsageError(
            f"{source}: {score} is a ratio of at most 1 (found {text!r}); write 0.72 or 72%"
        )
    return Limit(score, sense, value, sequence)


def read_limits(path: Path, sequences: Sequence[str]) -> list[Limit]:
    """Limits of a TOML file.

        [overall]              # of all sequences together
        idf1 = ">=0.72"
        [every]                # each sequence
        mota = ">=0.5"
        [sequences.forecourt]  # one sequence
        switches = ["<=10", ">=0"]

    sequences : the names that are scored.

    Raises InputError for a file that cannot be used, UsageError for unknown scores or sequences.
    """
    try:
        tables = tomllib.loads(path.read_text(encoding="utf-8"))
    except FileNotFoundError:
        raise InputError("there is no such file", path=path) from None
    except (OSError, UnicodeDecodeError, tomllib.TOMLDecodeError) as error:
        raise InputError(f"cannot be read as TOML: {error}", path=path) from None
    unknown = set(tables) - {OVERALL, "every", "sequences"}
    if unknown:
        raise InputError(
            "there is no such table",
            path=path,
            found=sorted(unknown)[0],
            remedy="There are [overall], [every] and [sequences.NAME].",
        )
    limits = _of_table(tables.get(OVERALL, {}), None, path, OVERALL)
    for name in sequences:
        limits += _of_table(tables.get("every", {}), name, path, "every")
    for name, table in _table(tables.get("sequences", {}), path, "sequences").items():
        if name not in sequences:
            raise UsageError(f"{path}: there is no sequence '{name}' here ({', '.join(sequences)})")
        limits += _of_table(table, name, path, f"sequences.{name}")
    if not limits:
        raise InputError("has no limits", path=path, remedy='Write [overall] and idf1 = ">=0.72".')
    return limits


def _of_table(table: Any, sequence: str | None, path: Path, place: str) -> list[Limit]:
    out = []
    for score, given in _table(table, path, place).items():
        for text in given if isinstance(given, list) else [given]:
            if not isinstance(text, str):
                raise InputError(
                    f'{place}.{score}: a limit is text such as ">=0.72"',
                    path=path,
                    found=str(text),
                )
            out.append(parse_limit(f"{score}{text}", sequence, source=f"{path}: {place}.{score}"))
    return out


def _table(found: Any, path: Path, place: str) -> dict[str, Any]:
    if not isinstance(found, dict):
        raise InputError(f"{place} is not a table", path=path, found=str(found))
    return found


def judge(evaluation: Evaluation, limits: Sequence[Limit]) -> list[Verdict]:
    """Hold the scores to the limits, in the order given."""
    return [Verdict(limit, _value(evaluation, limit)) for limit in limits]


def _value(evaluation: Evaluation, limit: Limit) -> float | None:
    scores: Scores = (
        evaluation.overall if limit.sequence is None else evaluation.sequences[limit.sequence]
    )
    return scores.value(limit.score)


def verdict_table(verdicts: Sequence[Verdict]) -> str:
    """One line a limit: met or not, where, what was asked and what was found."""
    rows = [("", "sequence", "limit", "found")]
    for verdict in verdicts:
        found = "no value" if verdict.found is None else f"{verdict.found:.6g}"
        word = "met" if verdict.met else "NOT MET"
        rows.append((word, verdict.where, verdict.limit.words, found))
    widths = [max(len(row[k]) for row in rows) for k in range(4)]
    return "\n".join(
        "  ".join(cell.ljust(width) for cell, width in zip(row, widths, strict=True)).rstrip()
        for row in rows
    )
