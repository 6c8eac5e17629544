"""Settings from TOML and overrides, and back to TOML with each setting's meaning beside it."""

from __future__ import annotations

import math
from collections.abc import Iterator
from pathlib import Path
from typing import Any, get_args, get_type_hints

import msgspec
from msgspec import Meta, Struct

from tracker.settings.reading import apply_override, read_toml, refusal
from tracker.settings.schema import Settings


def load_settings(path: str | Path | None = None, overrides: tuple[str, ...] = ()) -> Settings:
    """Read a TOML file (or the defaults) and apply ``section.name=value`` overrides.

    Raises InputError for an unreadable file, SettingsError for an unknown name, a wrong type or
    a value out of range; both name the setting and what is allowed.
    """
    values: dict[str, Any] = {}
    source = ""
    if path is not None:
        source = str(path)
        values = read_toml(Path(path), example="margent associate --print-settings")
    for text in overrides:
        apply_override(values, text)
    return settings_from(values, source=source)


def settings_from(values: dict[str, Any], source: str = "") -> Settings:
    """Validate plain nested dictionaries; the string 'none' stands for an unset value."""
    try:
        return msgspec.convert(_unset(values, Settings), Settings)
    except msgspec.ValidationError as error:
        known = [path for path, _, _ in describe()]
        raise refusal(error, known, source=source, none_such="there is no setting") from None


def _unset(value: Any, hint: Any) -> Any:
    """Replace 'none' by an unset value, except where 'none' is a choice of its own."""
    if isinstance(value, dict):
        hints = _hints_of(hint)
        return {key: _unset(item, hints.get(key)) for key, item in value.items()}
    if isinstance(value, (list, tuple)):
        return [_unset(item, hint) for item in value]
    return None if value == "none" and "none" not in _choices(hint) else value


def _hints_of(hint: Any) -> dict[str, Any]:
    """Types of a section's settings, by name; `hint` may wrap the section in a tuple or union."""
    if isinstance(hint, type) and issubclass(hint, Struct):
        return get_type_hints(hint, include_extras=True)
    for item in get_args(hint):
        found = _hints_of(item)
        if found:
            return found
    return {}


def settings_as_dict(settings: Settings) -> dict[str, Any]:
    """Nested plain values, None included."""
    return msgspec.to_builtins(settings)


def settings_as_toml(settings: Struct, *, comments: bool = True) -> str:
    """The complete settings as TOML; with comments each line says meaning, unit and source."""
    lines: list[str] = []
    section = ""
    for path, value, facts in describe(settings):
        parent, _, name = path.rpartition(".")
        if parent != section:
            section = parent
            lines += ["", _heading(parent)]
        if comments:
            lines += [f"# {line}" for line in _comment(facts)]
        lines.append(f"{name} = {_toml_value(value)}")
    return "\n".join(lines[1:]) + "\n"


def _heading(section: str) -> str:
    """TOML heading of a section; an item of a list is a table of its own."""
    name, bracket, rest = section.partition("[")
    if not bracket:
        return f"[{section}]"
    below = rest.partition("]")[2]
    return f"[{name}{below}]" if below else f"[[{name}]]"


def describe(settings: Struct | None = None) -> Iterator[tuple[str, Any, dict[str, str]]]:
    """Yield (path, value, {'meaning', 'unit', 'source', 'allowed'}) of every setting in order."""
    yield from _describe(settings or Settings(), "")


def _describe(section: Struct, prefix: str) -> Iterator[tuple[str, Any, dict[str, str]]]:
    hints = get_type_hints(type(section), include_extras=True)
    nested = []
    for name in section.__struct_fields__:
        value = getattr(section, name)
        if isinstance(value, Struct):
            nested.append((f"{prefix}{name}", value))
        elif isinstance(value, tuple) and value and isinstance(value[0], Struct):
            nested += [(f"{prefix}{name}[{k}]", item) for k, item in enumerate(value)]
        elif value is not None or not _is_section(hints[name]):
            yield f"{prefix}{name}", value, _facts_of(hints[name])
    for path, value in nested:
        yield from _describe(value, f"{path}.")


def _is_section(hint: Any) -> bool:
    """Whether a hint allows a section of its own (`GateSettings | None`)."""
    if isinstance(hint, type) and issubclass(hint, Struct):
        return True
    return any(_is_section(item) for item in get_args(hint))


def _facts_of(hint: Any) -> dict[str, str]:
    facts = {"meaning": "", "unit": "", "source": ""}
    bounds: list[str] = []
    for meta in _metas(hint):
        if meta.description:
            facts |= {"meaning": meta.description, **(meta.extra or {})}
        for sign, bound in (("≥", meta.ge), (">", meta.gt), ("≤", meta.le), ("<", meta.lt)):
            if bound is not None:
                bounds.append(f"{sign} {bound:g}")
    choices = _choices(hint)
    facts["allowed"] = " or ".join(choices) if choices else " and ".join(bounds)
    return facts


def _metas(hint: Any) -> list[Meta]:
    """All msgspec annotations of a hint, those inside a union included."""
    inner = [meta for item in get_args(hint) for meta in _metas(item)]
    return [meta for meta in getattr(hint, "__metadata__", ()) if isinstance(meta, Meta)] + inner


def _choices(hint: Any) -> list[str]:
    """The values of a Literal anywhere inside `hint`."""
    arguments = get_args(hint)
    if arguments and all(isinstance(item, str) for item in arguments):
        return [str(item) for item in arguments]
    return [choice for item in arguments for choice in _choices(item)]


def _comment(facts: dict[str, str]) -> list[str]:
    extras = [
        f"{label}: {facts[key]}"
        for key, label in (("unit", "unit"), ("allowed", "allowed"), ("source", "source"))
        if facts[key]
    ]
    return [facts["meaning"], *(["  " + "; ".join(extras)] if extras else [])]


def _toml_value(value: Any) -> str:
    if value is None:
        return '"none"'
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, float) and not math.isfinite(value):
        return "nan" if math.isnan(value) else ("inf" if value > 0 else "-inf")
    if isinstance(value, (int, float)):
        return repr(value)
    if isinstance(value, (tuple, list)):
        return "[" + ", ".join(_toml_value(item) for item in value) + "]"
    return msgspec.json.encode(str(value)).decode()
