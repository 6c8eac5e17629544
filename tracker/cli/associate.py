"""`margent associate`: detection logs in, tracks out."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from tracker.cli.options import ColumnNames, DropIdentities, FrameRate, LogFormat, Logs
from tracker.errors import InputError, MargentError, UsageError

if TYPE_CHECKING:
    from tracker.settings import Settings


def associate(
    logs: Logs = None,
    out: Annotated[
        Path | None,
        typer.Option(help="Folder of the run; with several logs, one folder a log inside it."),
    ] = None,
    settings: Annotated[
        Path | None, typer.Option(help="Settings as TOML; what it leaves out keeps its default.")
    ] = None,
    set_: Annotated[
        list[str] | None,
        typer.Option(
            "--set",
            metavar="SECTION.NAME=VALUE",
            help="Change one setting, e.g. --set lifecycle.coast_seconds=2. Repeatable.",
        ),
    ] = None,
    frame_rate_hz: FrameRate = None,
    columns: ColumnNames = None,
    log_format: LogFormat = None,
    drop_identities: DropIdentities = False,
    strict: Annotated[
        bool, typer.Option("--strict", help="Stop with exit code 2 if any row would be rejected.")
    ] = False,
    offline: Annotated[
        bool,
        typer.Option(
            "--offline",
            help="Once a log is over, decide identities anew: smooth, link and fill ([hindsight]).",
        ),
    ] = False,
    extension: Annotated[
        list[Path] | None,
        typer.Option(
            help="Python file that is run first, to register cost functions. Repeatable; only "
            "files that you trust."
        ),
    ] = None,
    workers: Annotated[int, typer.Option(min=1, help="Processes; each takes whole logs.")] = 1,
    print_settings: Annotated[
        bool,
        typer.Option("--print-settings", help="Print all settings with their meaning, and stop."),
    ] = False,
) -> None:
    """Associate the detections of each log into tracks.

    Reads CSV, Parquet, NDJSON or the public benchmark text layout, boxes or points, and writes a
    run folder: tracks.csv, tracks.parquet, events.csv, rejected.csv, settings.toml, run.json.

    With --offline tracks.csv has the identities that are only known afterwards, links.csv says how
    they came about, and tracks_online.csv keeps the engine's own.

    Example: margent associate sample_sequences/forecourt --out runs/forecourt
    """
    from tracker.log.columns import parse_columns
    from tracker.settings import load_settings, settings_as_toml

    overrides = list(set_ or [])
    if frame_rate_hz is not None:
        overrides.append(f"time.frame_rate_hz={frame_rate_hz}")
    chosen = load_settings(settings, tuple(overrides))
    if print_settings:
        sys.stdout.write(settings_as_toml(chosen))
        return
    if not logs:
        raise UsageError("name at least one detection log, or use --print-settings")
    reading = {
        "columns": parse_columns(columns or []),
        "format": log_format,
        "drop_identities": drop_identities,
        "strict": strict,
    }
    _associate_all(logs, out, chosen, reading, workers, tuple(extension or ()), offline)


def _associate_all(
    paths: list[Path],
    out: Path | None,
    settings: Settings,
    reading: dict,
    workers: int,
    extensions: tuple[Path, ...],
    offline: bool,
) -> None:
    """All logs, in one process or several; one log's error does not stop the others."""
    from tracker.batch import associate_logs
    from tracker.cli.progress import announce_compiling, watched

    announce_compiling()
    several = len(paths) > 1
    failures: list[MargentError] = []
    outcomes = associate_logs(
        paths,
        out,
        settings,
        reading,
        workers,
        extensions,
        watch=lambda frames, total: watched(frames, total=total, label="frames"),
        offline=offline,
    )
    if workers > 1 and several:
        outcomes = watched(outcomes, total=len(paths), label="logs")
    for outcome in outcomes:
        if isinstance(outcome.error, MargentError):
            if not several:
                raise outcome.error
            print(f"margent: {outcome.error}", file=sys.stderr)
            failures.append(outcome.error)
        else:
            _report(outcome.facts, outcome.folder)
    if failures:
        raise InputError(f"{len(failures)} of {len(paths)} logs failed, see above")


def _report(facts: dict, folder: Path) -> None:
    counts, proof = facts["counts"], facts["certificate"]
    for note in facts["notes"]:
        print(f"{facts['name']}: note: {note}", file=sys.stderr)
    if counts["rejected_rows"]:
        rows = "row" if counts["rejected_rows"] == 1 else "rows"
        print(
            f"{facts['name']}: {counts['rejected_rows']} {rows} rejected, listed with reasons in "
            f"{folder / 'rejected.csv'}",
            file=sys.stderr,
        )
    print(
        f"{facts['name']}: {counts['frames']} frames, {counts['detections']} detections, "
        f"{counts['tracks_confirmed']} tracks in {folder} "
        f"(every assignment proved optimal, largest gap {proof['largest_gap']:.1e})",
        file=sys.stderr,
    )
    if "hindsight" in facts:
        looked = facts["hindsight"]
        print(
            f"{facts['name']}: in hindsight {looked['objects']} objects, by {looked['links_made']} "
            f"links between tracks, listed with margins in {folder / 'links.csv'}; the engine's "
            "own tracks are in tracks_online",
            file=sys.stderr,
        )
