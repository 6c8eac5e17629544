"""`margent inspect`: check and summarise detection logs."""

from __future__ import annotations

import json
import sys
from pathlib import Path
from typing import Annotated

import typer

from tracker.cli.options import ColumnNames, DropIdentities, FrameRate, LogFormat
from tracker.errors import EXIT_USAGE, InputError


def inspect(
    logs: Annotated[
        list[Path],
        typer.Argument(
            metavar="LOG...", help="Detection logs, or folders with one detections.* each."
        ),
    ],
    json_: Annotated[bool, typer.Option("--json", help="Print JSON instead of a table.")] = False,
    columns: ColumnNames = None,
    log_format: LogFormat = None,
    frame_rate_hz: FrameRate = None,
    drop_identities: DropIdentities = False,
) -> None:
    """Check detection logs and say what is in them, before anything is computed.

    Shows rows, frames, gaps, frame rate, scores, sizes, labels, boxes outside the image, near
    duplicates, and which rows would be rejected and why. Writes nothing.

    Example: margent inspect detections.csv --columns conf=score
    """
    from tracker.log import inspect_log, parse_columns, summary_text

    mapping = parse_columns(columns or ())
    unicode = (getattr(sys.stdout, "encoding", None) or "").lower().replace("-", "") == "utf8"
    summaries, failures = [], []
    for path in logs:
        try:
            summary = inspect_log(
                path,
                columns=mapping,
                format=log_format,
                frame_rate_hz=frame_rate_hz,
                drop_identities=drop_identities,
            )
        except InputError as error:
            if len(logs) == 1:
                raise
            failures.append(error)
            continue
        if json_:
            summaries.append(summary.as_dict())
        else:
            typer.echo(
                ("\n" if summaries else "") + summary_text(summary, unicode=unicode), nl=False
            )
            summaries.append({})
    if json_:
        typer.echo(json.dumps({"logs": summaries}, indent=2, ensure_ascii=not unicode))
    for failure in failures:
        typer.echo(f"margent: {failure}", err=True)
    if failures:
        raise typer.Exit(EXIT_USAGE)
