"""Settings of a scene from a file and ``section.name=value``, and back to a command line."""

from __future__ import annotations

import math
import shlex
from pathlib import Path
from typing import Any, TypeVar

import msgspec

from tracker.errors import SettingsError
from tracker.settings import describe
from tracker.settings.reading import apply_override, merge, read_toml, refusal
from tracker.simulation.settings import SceneSettings

S = TypeVar("S", bound=SceneSettings)


def scene_settings(defaults: S, file: Path | None = None, overrides: tuple[str, ...] = ()) -> S:
    """The defaults of a scene, changed by a TOML file and then by ``section.name=value``.

    Raises InputError for an unreadable file, SettingsError for an unknown name, a wrong type or
    a value out of range; both name the setting and what is allowed.
    """
    values = msgspec.to_builtins(defaults)
    if file is not None:
        merge(values, read_toml(file, example="margent simulate SCENE --print-settings"))
    for text in overrides:
        apply_override(values, text)
    source = "--set" if file is None else str(file)
    try:
        settings = msgspec.convert(values, type(defaults))
    except msgspec.ValidationError as error:
        known = [path for path, _, _ in describe(defaults)]
        raise refusal(error, known, source=source, none_such="this scene has no setting") from None
    for path, value, _ in describe(settings):
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
