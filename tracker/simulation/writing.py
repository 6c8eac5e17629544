"""Write a simulated sequence as a folder: its tables and `sequence.toml`."""

from __future__ import annotations

import tomllib
from collections.abc import Collection
from importlib.metadata import PackageNotFoundError, version
from pathlib import Path

import msgspec

from tracker.errors import OutputError
from tracker.log.facts import FACTS_FILE
from tracker.results.folder import atomic_folder
from tracker.simulation.overrides import command
from tracker.simulation.scenes import SCENES
from tracker.simulation.sequence import SimulatedSequence
from tracker.simulation.tables import csv_bytes

HOW_MADE = "simulated"  # the table of sequence.toml that marks a folder as ours
WRITTEN = frozenset(
    {
        FACTS_FILE,
        "camera.csv",
        "detections.csv",
        "detections_oriented.csv",
        "detections_polar.csv",
        "truth.csv",
        "truth_oriented.csv",
    }
)


def software_version() -> str:
    """Margent's version, 'unknown' when it runs from a source tree that is not installed."""
    try:
        return version("margent")
    except PackageNotFoundError:
        return "unknown"


def sequence_files(sequence: SimulatedSequence, made_by: str | None = None) -> dict[str, bytes]:
    """Every file of the folder by name; `made_by` is the version that sequence.toml states."""
    files = {name: csv_bytes(columns) for name, columns in sequence.tables.items()}
    files[FACTS_FILE] = facts_toml(sequence, made_by or software_version()).encode()
    return files


def facts_toml(sequence: SimulatedSequence, made_by: str) -> str:
    """sequence.toml: what is known of the sequence, and how it was made."""
    facts = sequence.facts
    known = {name: getattr(facts, name) for name in facts.__slots__}
    lines = [
        f"{name} = {_value(value)}" for name, value in known.items() if value not in (None, ())
    ]
    defaults = SCENES[sequence.scene].settings
    how = {
        "scene": sequence.scene,
        "seed": sequence.seed,
        "version": made_by,
        "command": command(sequence.scene, sequence.seed, sequence.settings, defaults),
        "note": "invented people and vehicles; no real data",
    }
    lines += ["", f"[{HOW_MADE}]", *(f"{name} = {_value(value)}" for name, value in how.items())]
    for name, text in sequence.notes.items():
        lines.append(f"{name} = {_value(text)}")
    return "\n".join(lines) + "\n"


def _value(value: object) -> str:
    """Numbers and texts as TOML; whole numbers without a point."""
    if isinstance(value, float) and value.is_integer():
        value = int(value)
    return msgspec.json.encode(value).decode()


def write_sequence(
    sequence: SimulatedSequence, folder: Path, *, replacing: Collection[str] = ()
) -> None:
    """Write the folder, complete or not at all; an earlier simulation there is replaced.

    `replacing` names further files (a video) that may be there and go with it.

    Raises OutputError where it cannot be written or holds anything that is not of a simulation.
    """
    files = sequence_files(sequence)
    _check_replaceable(folder, WRITTEN.union(replacing))
    with atomic_folder(folder, marker=FACTS_FILE) as working:
        for name, data in files.items():
            (working / name).write_bytes(data)


def _check_replaceable(folder: Path, ours: Collection[str]) -> None:
    """A folder of someone's own log also has a sequence.toml: look closer before replacing it."""
    if not folder.is_dir():
        return
    names = {item.name for item in folder.iterdir()}
    strange = sorted(names.difference(ours))
    if strange:
        raise OutputError(
            f"holds a file that no simulation wrote ({strange[0]}); choose another --out",
            path=folder,
        )
    if names and not _is_simulated(folder / FACTS_FILE):
        raise OutputError(
            f"holds a log that was not simulated (no [{HOW_MADE}] in its {FACTS_FILE}); choose "
            "another --out",
            path=folder,
        )


def _is_simulated(facts: Path) -> bool:
    try:
        return HOW_MADE in tomllib.loads(facts.read_text(encoding="utf-8"))
    except (OSError, UnicodeDecodeError, tomllib.TOMLDecodeError):
        return False
