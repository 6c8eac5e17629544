"""`sequence.toml`: what is known of a sequence besides its rows."""

from __future__ import annotations

import math
import tomllib
from pathlib import Path
from typing import Any

import shapely

from tracker.errors import InputError
from tracker.log.model import SequenceFacts

FACTS_FILE = "sequence.toml"
GENERIC_STEMS = ("detections", "truth", "tracks")  # stems that say nothing about the sequence

_TEXTS = ("name", "sensor")
_POSITIVE = ("frame_rate_hz", "image_width", "image_height")


def read_facts(log: Path) -> SequenceFacts:
    """Read the `sequence.toml` in the log's folder; no file means no facts.

    Keys that are not known are left alone (later tools may add theirs); a known key with a
    value that cannot be right is an InputError that names it.
    """
    path = log.parent / FACTS_FILE
    try:
        values = tomllib.loads(path.read_text(encoding="utf-8-sig"))
    except FileNotFoundError:
        return SequenceFacts()
    except UnicodeDecodeError as error:
        raise InputError(f"not UTF-8 text (byte offset {error.start})", path=path) from None
    except tomllib.TOMLDecodeError as error:
        raise InputError(f"not valid TOML: {error}", path=path) from None
    except OSError as error:
        raise InputError(f"cannot be read: {error.strerror}", path=path) from None
    facts: dict[str, Any] = {}
    for key in _TEXTS:
        if key in values:
            facts[key] = _text(path, key, values[key])
    for key in _POSITIVE:
        if key in values:
            facts[key] = float(_positive(path, key, values[key], "a number greater than 0"))
    if "frames" in values:
        frames = _positive(path, "frames", values["frames"], "a whole number greater than 0")
        if frames != int(frames):
            raise _wrong(path, "frames", values["frames"], "a whole number greater than 0")
        facts["frames"] = int(frames)
    facts["exit_zones"] = tuple(_zone(path, zone) for zone in _list(path, values))
    return SequenceFacts(**facts)


def name_of(log: Path, facts: SequenceFacts) -> str:
    """The sequence's name: from the facts, else the folder (for generic stems), else the stem."""
    if facts.name is not None:
        return facts.name
    folder = log.absolute().parent.name
    return folder if log.stem in GENERIC_STEMS and folder else log.stem


def _list(path: Path, values: dict[str, Any]) -> list[Any]:
    zones = values.get("exit_zones", [])
    if not isinstance(zones, list):
        raise _wrong(path, "exit_zones", zones, "a list of polygons, [[x, y], [x, y], [x, y], …]")
    return zones


def _zone(path: Path, zone: Any) -> tuple[tuple[float, float], ...]:
    """A polygon of three corners or more, that does not cross itself."""
    expected = "polygons of three corners [x, y] or more that do not cross themselves"
    try:
        corners = tuple((float(x), float(y)) for x, y in zone)
    except (TypeError, ValueError):
        raise _wrong(path, "exit_zones", zone, expected) from None
    if len(corners) < 3 or not shapely.Polygon(corners).is_valid:
        raise _wrong(path, "exit_zones", zone, expected)
    return corners


def _text(path: Path, key: str, value: Any) -> str:
    if not isinstance(value, str) or not value.strip():
        raise _wrong(path, key, value, "text in quotation marks")
    return value.strip()


def _positive(path: Path, key: str, value: Any, expected: str) -> float:
    number = isinstance(value, (int, float)) and not isinstance(value, bool)
    if not number or not math.isfinite(value) or value <= 0:
        raise _wrong(path, key, value, expected)
    return value


def _wrong(path: Path, key: str, value: Any, expected: str) -> InputError:
    return InputError(f"'{key}' must be {expected}", path=path, found=str(value))
