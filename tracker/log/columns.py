"""Which columns a file may have, and how the names it has become ours.

A role (detections, truth, tracks) decides which columns are of use. `choose_columns` maps the
file's names, picks boxes or points, and says what is ignored; when something needed is absent
the error proposes the `--columns` that would mend it.
"""

from __future__ import annotations

import difflib
import re
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from enum import StrEnum
from pathlib import Path

from tracker.errors import InputError, UsageError
from tracker.log.model import Kind

IDENTITY = ("object", "track", "id")
EMBEDDING = re.compile(r"embedding_(0|[1-9]\d*)")
NAMES_SHOWN = 12

# Plain words that people use for our names. They only feed suggestions, nothing is guessed.
SYNONYMS = {
    "frame": ("frame_number", "frame_id", "frame_index", "frameno", "scan"),
    "time": ("timestamp", "seconds", "time_s", "t"),
    "left": ("x_min", "xmin", "x1", "l"),
    "top": ("y_min", "ymin", "y1"),
    "width": ("w", "box_width"),
    "height": ("h", "box_height"),
    "x": ("px", "pos_x", "position_x", "x_position"),
    "y": ("py", "pos_y", "position_y", "y_position"),
    "score": ("confidence", "conf", "probability", "certainty"),
    "label": ("class", "category", "type", "class_name"),
    "object": ("identity", "object_id", "track_id", "person"),
}


class Role(StrEnum):
    """What a file is read as."""

    DETECTIONS = "detections"
    TRUTH = "truth"
    TRACKS = "tracks"


_OPTIONAL_NUMBERS = {
    Role.DETECTIONS: ("score",),
    Role.TRUTH: ("visibility",),
    Role.TRACKS: ("score", "line"),
}
_OPTIONAL_WORDS = {
    Role.DETECTIONS: ("label", "sensor", *IDENTITY),
    Role.TRUTH: ("label", "scored", *IDENTITY),
    Role.TRACKS: ("label", "state", "reported", *IDENTITY),
}


@dataclass(frozen=True, slots=True)
class Choice:
    """Our column name → the name in the file, for numbers and for words (text or codes)."""

    kind: Kind
    numbers: dict[str, str]
    words: dict[str, str]
    notes: tuple[str, ...] = ()


def parse_columns(pairs: Iterable[str]) -> dict[str, str]:
    """Turn ``["conf=score", "w=width,h=height"]`` (the `--columns` flag) into a mapping.

    Raises UsageError for a piece that is not THEIRS=OURS.
    """
    mapping: dict[str, str] = {}
    for piece in (part for pair in pairs for part in pair.split(",")):
        theirs, equals, ours = (text.strip() for text in piece.rpartition("="))
        if not (theirs and equals and ours):
            raise UsageError(
                f"--columns: expected THEIRS=OURS, such as conf=score (found {piece!r})"
            )
        mapping[theirs] = ours
    return mapping


def known_names(role: Role) -> tuple[str, ...]:
    """Every name a column may have in this role; embeddings are `embedding_0`, …"""
    names: dict[str, None] = dict.fromkeys(("frame", "time"))
    for kind in Kind:
        names |= dict.fromkeys(kind.columns)
    names |= dict.fromkeys((*_OPTIONAL_NUMBERS[role], *_OPTIONAL_WORDS[role]))
    if role is Role.DETECTIONS:
        for kind in Kind:
            names |= dict.fromkeys(kind.sigma_columns)
    return tuple(names)


def optional_numbers(role: Role) -> tuple[str, ...]:
    """Columns of numbers that a file may have, sigmas and embeddings aside."""
    return _OPTIONAL_NUMBERS[role]


def optional_words(role: Role) -> tuple[str, ...]:
    """Columns of text or codes that a file may have."""
    return _OPTIONAL_WORDS[role]


def rename(
    names: Sequence[str], mapping: Mapping[str, str], *, role: Role, path: Path, line: int | None
) -> dict[str, str]:
    """Our name → the file's name, for every column that is known or mapped to a known name.

    Raises UsageError if the mapping is not usable, InputError if it does not fit the file.
    """
    known = known_names(role)
    for theirs, ours in mapping.items():
        if ours not in known and not EMBEDDING.fullmatch(ours):
            hint = _did_you_mean(ours, known) or f"; the names are {', '.join(known)}"
            raise UsageError(f"--columns {theirs}={ours}: there is no column '{ours}'{hint}")
        if theirs not in names:
            raise InputError(
                f"--columns names a column that is not there{_did_you_mean(theirs, names)}",
                path=path,
                line=line,
                found=theirs,
                remedy=f"The columns are: {_listed(names)}.",
            )
    repeated = sorted({ours for ours in mapping.values() if [*mapping.values()].count(ours) > 1})
    if repeated:
        raise UsageError(f"--columns: two columns are both mapped to '{repeated[0]}'")
    ours_to_theirs = {
        name: name
        for name in names
        if name not in mapping and (name in known or EMBEDDING.fullmatch(name))
    }
    return ours_to_theirs | {ours: theirs for theirs, ours in mapping.items()}


def choose_columns(
    names: Sequence[str],
    mapping: Mapping[str, str],
    *,
    role: Role,
    path: Path,
    line: int | None = 1,
) -> Choice:
    """Decide which columns of a file with these names are read, and as what.

    Raises InputError when the columns do not make a log, truth or track file.
    """
    found = rename(names, mapping, role=role, path=path, line=line)
    kind = _kind_of(found)
    if kind is None or not ("frame" in found or "time" in found):
        raise _unusable_header(names, found, mapping, role=role, path=path, line=line)
    numbers = ["frame", "time", *kind.columns, *_OPTIONAL_NUMBERS[role]]
    if role is Role.DETECTIONS:
        numbers += _sigma_columns(found, kind, path, line) + _embedding_columns(found, path, line)
    chosen_numbers = {name: found[name] for name in numbers if name in found}
    chosen_words = {name: found[name] for name in _OPTIONAL_WORDS[role] if name in found}
    used = {*chosen_numbers.values(), *chosen_words.values()}
    twice = [name for name in used if [*names].count(name) > 1]
    if twice:
        raise InputError(
            "two columns have the same name",
            path=path,
            line=line,
            found=min(twice),
            remedy="Rename one of them.",
        )
    ignored = [name for name in names if name not in used]
    have = {*chosen_numbers, *chosen_words}
    return Choice(kind, chosen_numbers, chosen_words, tuple(_ignored(ignored, have, role)))


def _kind_of(found: Mapping[str, str]) -> Kind | None:
    """Boxes where all box columns are there, else points where x and y are."""
    for kind in Kind:
        if all(name in found for name in kind.columns):
            return kind
    return None


def _sigma_columns(found: Mapping[str, str], kind: Kind, path: Path, line: int | None) -> list[str]:
    present = [name for name in kind.sigma_columns if name in found]
    lacking = [name for name in kind.sigma_columns if name not in found]
    if present and lacking:
        raise InputError(
            f"there is '{present[0]}' but not '{lacking[0]}'", path=path, line=line,
            remedy=f"Give all of {', '.join(kind.sigma_columns)}, or none.",
        )  # fmt: skip
    return present


def _embedding_columns(found: Mapping[str, str], path: Path, line: int | None) -> list[str]:
    numbers = sorted(int(match[1]) for name in found if (match := EMBEDDING.fullmatch(name)))
    if numbers != list(range(len(numbers))):
        gap = next(k for k, number in enumerate(numbers) if number != k)
        raise InputError(
            f"the embedding columns skip 'embedding_{gap}'", path=path, line=line,
            remedy="Number them from embedding_0 without a gap.",
        )  # fmt: skip
    return [f"embedding_{k}" for k in numbers]


def _ignored(ignored: Sequence[str], have: set[str], role: Role) -> list[str]:
    """Notes on the columns that are not read, with a hint where one looks like ours."""
    if not ignored:
        return []
    notes = [f"ignored columns: {_listed([name or '(no name)' for name in ignored])}"]
    for theirs, ours in _suggest(ignored, [n for n in known_names(role) if n not in have]):
        if ours in ("score", "label"):
            notes.append(f"if column '{theirs}' is the {ours}, say --columns {theirs}={ours}")
    return notes


def _unusable_header(
    names: Sequence[str],
    found: Mapping[str, str],
    mapping: Mapping[str, str],
    *,
    role: Role,
    path: Path,
    line: int | None,
) -> InputError:
    lacking = [] if "frame" in found or "time" in found else ["'frame' or 'time'"]
    unused = [name for name in names if name not in found.values() and name not in mapping]
    best = max(Kind, key=lambda kind: _likeness(kind, found, unused))
    if _kind_of(found) is None:
        absent = [f"'{name}'" for name in best.columns if name not in found]
        if len(absent) == best.dimension:
            absent = ["the measurement (left, top, width, height or x, y)"]
        lacking += absent
    wanted = [name for name in ("frame", "time", *best.columns) if name not in found]
    if "frame" in found or "time" in found:
        wanted = [name for name in wanted if name in best.columns]
    pairs = _suggest(unused, wanted)
    remedy = (
        "Did you mean " + " ".join(f"--columns {theirs}={ours}" for theirs, ours in pairs) + "?"
        if pairs
        else "Map other names with --columns THEIRS=OURS."
    )
    if len(names) == 1 and len(names[0].split()) > 1:
        remedy = "Separate the columns by commas, semicolons or tabs."
    return InputError(
        f"this is no header of a {role.value} file: no column for {' and '.join(lacking)}",
        path=path,
        line=line,
        found=_listed(names),
        remedy="Needed are 'frame' or 'time' (seconds), and 'left', 'top', 'width', 'height' for "
        f"boxes or 'x', 'y' for points. {remedy}",
    )


def _likeness(kind: Kind, found: Mapping[str, str], unused: Sequence[str]) -> float:
    """Share of a kind's columns that are there, or nearly."""
    absent = [name for name in kind.columns if name not in found]
    return (kind.dimension - len(absent) + 0.9 * len(_suggest(unused, absent))) / kind.dimension


def _suggest(theirs: Sequence[str], ours: Sequence[str]) -> list[tuple[str, str]]:
    """Pairs (their name, our name) that probably mean the same, each name used once."""
    pairs, left = [], list(theirs)
    for name in ours:
        plain = {re.sub(r"[^a-z0-9]+", "_", other.lower()).strip("_"): other for other in left}
        candidates = (name, *SYNONYMS.get(name, ()))
        match = next((plain[word] for word in candidates if word in plain), None)
        if match is None and len(name) > 2:
            near = difflib.get_close_matches(name, list(plain), n=1, cutoff=0.75)
            match = plain[near[0]] if near else None
        if match is not None:
            pairs.append((match, name))
            left.remove(match)
    return pairs


def _did_you_mean(word: str, known: Sequence[str]) -> str:
    near = difflib.get_close_matches(word, known, n=1, cutoff=0.6)
    return f"; did you mean '{near[0]}'?" if near else ""


def _listed(names: Sequence[str]) -> str:
    more = len(names) - NAMES_SHOWN
    return ", ".join(names[:NAMES_SHOWN]) + (f", and {more} more" if more > 0 else "")
