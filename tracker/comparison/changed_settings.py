"""Which settings differ between two runs, and what else they were made from."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import asdict, dataclass
from pathlib import Path
from typing import Any

from tracker.results.read import read_facts
from tracker.settings.reading import read_toml

SETTINGS_FILE = "settings.toml"


@dataclass(frozen=True, slots=True)
class ChangedSetting:
    """A setting by its path; None where a run does not have it.

    sequences : where it differs so.
    """

    setting: str
    a: Any
    b: Any
    sequences: tuple[str, ...]

    def as_dict(self) -> dict[str, Any]:
        return asdict(self)


def changed_settings(runs: Mapping[str, tuple[Path, Path]]) -> list[ChangedSetting]:
    """Compare the settings.toml of two run folders a sequence, in the order of the files.

    The files are compared as they stand: an older version may have had settings that this one
    does not know. Raises InputError for a file that cannot be read.
    """
    found: dict[tuple[str, str, str], tuple[Any, Any, list[str]]] = {}
    for name, folders in runs.items():
        a, b = (
            dict(_flat(read_toml(folder / SETTINGS_FILE, example="margent associate")))
            for folder in folders
        )
        for setting in dict.fromkeys((*a, *b)):
            pair = a.get(setting), b.get(setting)
            if pair[0] != pair[1]:
                key = (setting, repr(pair[0]), repr(pair[1]))
                found.setdefault(key, (*pair, []))[2].append(name)
    return [
        ChangedSetting(setting, a, b, tuple(names))
        for (setting, _, _), (a, b, names) in found.items()
    ]


def changed_sources(runs: Mapping[str, tuple[Path, Path]]) -> list[str]:
    """Sentences about runs that were made from different logs or by different versions.

    Raises InputError for a run.json that cannot be read.
    """
    logs, versions = [], set()
    for name, folders in runs.items():
        a, b = (read_facts(folder) for folder in folders)
        if a.get("input", {}).get("sha256") != b.get("input", {}).get("sha256"):
            logs.append(name)
        versions.add(tuple(facts.get("versions", {}).get("margent", "?") for facts in (a, b)))
    out = []
    if logs:
        out.append(f"the runs were made from different logs: {', '.join(logs)}")
    out += [f"A was made by margent {a}, B by {b}" for a, b in sorted(versions) if a != b]
    return out


def _flat(values: Mapping[str, Any], prefix: str = "") -> Iterator[tuple[str, Any]]:
    """Settings by path; tables of a list are numbered from 0."""
    for key, value in values.items():
        if isinstance(value, dict):
            yield from _flat(value, f"{prefix}{key}.")
        elif isinstance(value, list) and value and all(isinstance(item, dict) for item in value):
            for k, item in enumerate(value):
                yield from _flat(item, f"{prefix}{key}[{k}].")
        else:
            yield f"{prefix}{key}", value
