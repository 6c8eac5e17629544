"""Settings of a scene from a file and ``section.name=value``, and back to a command line."""

from __future__ import annotations

import difflib
import math
import shlex
import tomllib
from pathlib import Path
from typing import Any, TypeVar

import msgspec

from tracker.errors import InputError, SettingsError
from tracker.settings import describe
from tracker.simulation.settings import SceneSettings

S = TypeVar("S", bound=SceneSettings)


def scene_settings(defaults: S, file: Path | None = None, overrides: tuple[str, ...] = ()) -> S:
    """The defaults of a scene, changed by a TOML file and then by ``section.name=value``.

    Raises InputError for an unreadable file, SettingsError for an unknown name, a wrong type or
    a value out of range; both name the setting and what is allowed.
    """
    values = msgspec.to_builtins(defaults)
    if file is not None:
        _merge(values, _read_toml(file))
    for text in overrides:
        _apply(values, text)
    source = "--set" if file is None else str(file)
    try:
        settings = msgspec.convert(values, type(defaults))
    except msgspec.ValidationError as error:
        problem, _, path = str(error).partition(" - at `$.")
        path = path.rstrip("`")
        raise SettingsError(_remedy(problem, path, defaults), setting=path, source=source) from None
    for path, value, _ in describe(settings):  # type: ignore[arg-type]
        if isinstance(value, float) and not math.isfinite(value):
            raise SettingsError("must be a finite number", setting=path, source=source)
    return settings


def changes(settings: SceneSettings, defaults: SceneSettings) -> list[str]:
    """The ``section.name=value`` texts that turn `defaults` into `settings`.

    A list of sections (doors, places) that differs is one text for the whole list.
    """
    texts: list[str] = []
    _compare(msgspec.to_builtins(settings), msgspec.to_builtins(defaults), "", texts)
    return texts


def command(scene: str, seed: int, settings: SceneSettings, defaults: SceneSettings) -> str:
    """The shell command that simulates the same sequence again."""
    words = ["margent", "simulate", scene, "--seed", str(seed)]
    for text in changes(settings, defaults):
        words += ["--set", text]
    return shlex.join(words)


def _compare(new: dict[str, Any], old: dict[str, Any], prefix: str, texts: list[str]) -> None:
    for name, value in new.items():
        if isinstance(value, dict):
            _compare(value, old[name], f"{prefix}{name}.", texts)
        elif value != old[name]:
            texts.append(f"{prefix}{name}={_toml(value)}")


def _toml(value: Any) -> str:
    """A value as TOML; JSON is TOML for numbers, texts and lists of them."""
    if isinstance(value, dict):
        return "{" + ", ".join(f"{name} = {_toml(item)}" for name, item in value.items()) + "}"
    if isinstance(value, (list, tuple)):
        return "[" + ", ".join(_toml(item) for item in value) + "]"
    return msgspec.json.encode(value).decode()


def _read_toml(path: Path) -> dict[str, Any]:
    try:
        return tomllib.loads(path.read_text(encoding="utf-8"))
    except OSError as error:
        raise InputError(f"the settings file cannot be read: {error.strerror}", path=path) from None
    except UnicodeDecodeError:
        raise InputError("the settings file is not UTF-8 text", path=path) from None
    except tomllib.TOMLDecodeError as error:
        raise InputError(
            f"not valid TOML: {error}",
            path=path,
            remedy="'margent simulate SCENE --print-settings' shows a complete file.",
        ) from None


def _merge(values: dict[str, Any], new: dict[str, Any]) -> None:
    """Lay `new` over `values`, section by section; unknown names stay, to be refused later."""
    for name, value in new.items():
        if isinstance(value, dict) and isinstance(values.get(name), dict):
            _merge(values[name], value)
        else:
            values[name] = value


def _apply(values: dict[str, Any], text: str) -> None:
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
    _merge(values, nested)


def _remedy(problem: str, path: str, defaults: SceneSettings) -> str:
    """Turn msgspec's message into one that also says what would be right."""
    if not problem.startswith("Object contains unknown field"):
        return problem[0].lower() + problem[1:]
    name = problem.split("`")[1]
    full = f"{path}.{name}" if path else name
    known = [key for key, _, _ in describe(defaults)]  # type: ignore[arg-type]
    near = difflib.get_close_matches(full, known, n=1, cutoff=0.4)
    hint = f"; did you mean '{near[0]}'?" if near else ""
    return f"this scene has no setting '{full}'{hint}"
