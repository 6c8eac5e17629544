"""Options that several commands share, each said once."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

Logs = Annotated[
    list[Path] | None,
    typer.Argument(metavar="LOG...", help="Detection logs, or folders with one detections.* each."),
]
ColumnNames = Annotated[
    list[str] | None,
    typer.Option(
        "--columns",
        metavar="THEIRS=OURS",
        help="Read column THEIRS of the log as OURS. Repeatable.",
    ),
]
LogFormat = Annotated[
    str | None, typer.Option("--format", help="Force the log's format instead of recognising it.")
]
FrameRate = Annotated[
    float | None,
    typer.Option(
        "--frame-rate-hz",
        help="Frame rate where neither sequence.toml nor timestamps give one.",
    ),
]
DropIdentities = Annotated[
    bool,
    typer.Option(
        "--drop-identities", help="Read a truth or track file as if it had no identities."
    ),
]
