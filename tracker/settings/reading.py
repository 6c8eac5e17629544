"""What reading any settings has in common: TOML files, overrides, and what to say when refused."""

from __future__ import annotations

import difflib
import tomllib
from collections.abc import Iterable
from pathlib import Path
from typing import Any

import msgspec

from tracker.errors import InputError, SettingsError


def read_toml(path: Path, *, example: str) -> dict[str, Any]:
    """A TOML file as nested dictionaries.

    example : the command that prints a complete file, for the message.

    Raises InputError for a file that cannot be read or is not TOML.
    """
    try:
        return tomllib.loads(path.read_text(encoding="utf-8"))
    except OSError as error:
        raise InputError(f"the settings file cannot be read: {error.strerror}", path=path) from None
    except UnicodeDecodeError:
        raise InputError("the settings file is not UTF-8 text", path=path) from None
    except tomllib.TOMLDecodeError as error:
        raise InputError(
            f"not valid TOML: {error}", path=path, remedy=f"'{example}' shows a complete file."
        ) from None


def apply_override(values: dict[str, Any], text: str) -> None:
    """Lay ``section.name=value`` over nested dictionaries; unknown names are refused later.

    Raises SettingsError for a text of another form.
    """
    path, equals, raw = text.partition("=")
    if not equals or not path.strip():
        raise SettingsError(f"expected section.name=value, found {text!r}", source="--set")
    try:
        value = tomllib.loads(f"value = {raw}")["value"]
    except tomllib.TOMLDecodeError:
        value = raw.strip()  # a bare word is a string
    nested: Any = value
    for name in reversed(path.strip().split(".")):
        nested = {name: nested}
    merge(values, nested)


def merge(values: dict[str, Any], new: dict[str, Any]) -> None:
    """Lay `new` over `values`, section by section."""
    for name, value in new.items():
        if isinstance(value, dict) and isinstance(values.get(name), dict):
            merge(values[name], value)
        else:
            values[name] = value


def refusal(
    error: msgspec.ValidationError, known: Iterable[str], *, source: str, none_such: str
) -> SettingsError:
    """The error to raise for values that msgspec refused, with what would be right.

    known : paths of all settings.   none_such : 'there is no setting', in the words that fit.
    """
    problem, _, path = str(error).partition(" - at `$.")
    path = path.rstrip("`")
    if not problem.startswith("Object contains unknown field"):
        return SettingsError(problem[0].lower() + problem[1:], setting=path, source=source)
    name = problem.split("`")[1]
    full = f"{path}.{name}" if path else name
    near = difflib.get_close_matches(full, known, n=1, cutoff=0.4)
    hint = f"; did you mean '{near[0]}'?" if near else ""
    return SettingsError(f"{none_such} '{full}'{hint}", setting=path, source=source)
