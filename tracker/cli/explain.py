"""`margent explain`: why a frame was decided as it was."""

from __future__ import annotations

import json
import sys
from pathlib import Path
from typing import Annotated

import typer

from tracker.errors import UsageError

LINE_PREFIX = "line:"


def explain(
    run: Annotated[Path, typer.Argument(metavar="RUN", help="Run folder with a ledger.")],
    frame: Annotated[int, typer.Option(help="Frame number.")],
    track: Annotated[int | None, typer.Option(help="Track id to explain.")] = None,
    detection: Annotated[
        int | None, typer.Option(help="Detection to explain, by its number in the frame, from 0.")
    ] = None,
    line: Annotated[
        int | None, typer.Option(help="Detection to explain, by its line in the log.")
    ] = None,
    why_not: Annotated[
        list[str] | None,
        typer.Option(
            metavar="J|line:L|I",
            help="For a track: detection number J, or line:L in the log, that it might have been "
            "given. For a detection: track id I. Repeatable.",
        ),
    ] = None,
    json_: Annotated[bool, typer.Option("--json", help="Print JSON instead of text.")] = False,
    picture: Annotated[
        Path | None, typer.Option(metavar="FILE.png", help="Also draw the decision.")
    ] = None,
) -> None:
    """Explain a frame's decision about a track or a detection, or all its contested decisions.

    Says what was chosen, what else was possible and how much worse (in nats, and as odds), what
    stood at the gate, why not the one you expected, and what the track did before and after. All
    of it is read from the run folder; nothing is decided anew.

    Example: margent explain runs/forecourt --frame 120 --track 7 --picture decision.png
    """
    from tracker.cli.progress import announce_compiling
    from tracker.diagnosis import explain as explain_frame

    announce_compiling()
    numbers, lines = _split(why_not or [])
    told = explain_frame(
        run,
        frame,
        track=track,
        detection=detection,
        line=line,
        others=numbers,
        other_lines=lines,
    )
    if picture is not None:
        from tracker.diagnosis.picture import draw

        draw(told, picture)
        print(f"drawn in {picture}", file=sys.stderr)
    if json_:
        typer.echo(json.dumps(told.as_dict(), indent=2, ensure_ascii=False))
    else:
        typer.echo(told.text(), nl=False)


def _split(texts: list[str]) -> tuple[list[int], list[int]]:
    """Numbers, and lines, of --why-not."""
    numbers: list[int] = []
    lines: list[int] = []
    for text in texts:
        target = lines if text.startswith(LINE_PREFIX) else numbers
        try:
            target.append(int(text.removeprefix(LINE_PREFIX)))
        except ValueError:
            raise UsageError(
                f"--why-not takes a detection number, line:L or a track id (found {text!r})"
            ) from None
    return numbers, lines
