"""`margent report`: a page to look at."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from tracker.cli.scoring import DistanceThreshold, IouThreshold, scopes_of
from tracker.errors import UsageError


def report(
    runs: Annotated[
        list[Path],
        typer.Argument(metavar="RUN...", help="Run folders, or folders of run folders."),
    ],
    truth: Annotated[
        list[str] | None,
        typer.Option(
            metavar="TRUTH",
            help="Truth file, for scores and causes; for several sequences repeat it in their "
            "order, give NAME=FILE, or one folder that holds NAME/truth.* for each.",
        ),
    ] = None,
    iou_threshold: IouThreshold = 0.5,
    distance_threshold: DistanceThreshold = None,
    out: Annotated[Path, typer.Option(help="The page to write.")] = Path("report.html"),
) -> None:
    """Write one page that shows the scene, its errors with causes, and every decision.

    The page opens from disk and asks nothing of the network. With truth it starts with the worst
    identity error and a button that goes there.

    Example:

    margent report runs/forecourt --truth sample_sequences/forecourt/truth.csv --out forecourt.html
    """
    from tracker.cli.progress import announce_compiling
    from tracker.cli.sequences import sources_by_name, truths_by_name
    from tracker.report import write_page
    from tracker.results import is_run

    sources = sources_by_name(runs)
    for path, _ in sources.values():
        if not is_run(path):
            raise UsageError(f"a report needs run folders, and {path} is a track file")
    truths = truths_by_name(truth, list(sources)) if truth else {}
    scopes = scopes_of(
        list(sources),
        iou_threshold=iou_threshold,
        distance_threshold=distance_threshold,
        score_class=None,
        ignore_class=None,
        ignore_region=None,
        visibility_floor=None,
        frame_stride=None,
        coasting="as-reported",
    )
    announce_compiling()
    size = write_page({name: path for name, (path, _) in sources.items()}, out, truths, scopes)
    typer.echo(f"{out}: {size / 1e6:.1f} MB; open it in a browser", err=True)
    typer.echo(
        "Tracks can be wrong, and tracks of people are personal data: keep the page as the law "
        "where you are asks.",
        err=True,
    )
