"""`margent calibrate`: settings measured from data."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Annotated

import typer

from tracker.cli.options import FrameRate, Logs
from tracker.cli.scoring import DistanceThreshold
from tracker.errors import UsageError


def calibrate(
    logs: Logs = None,
    truth: Annotated[
        list[Path] | None,
        typer.Option(help="Truth file; for several logs repeat it in their order."),
    ] = None,
    self_: Annotated[
        bool,
        typer.Option(
            "--self",
            help="Without truth: learn noise and detection probability from the engine's own "
            "confident tracks, corrected for what their gate cut off.",
        ),
    ] = False,
    out: Annotated[Path | None, typer.Option(help="Write the settings to this TOML file.")] = None,
    plots: Annotated[Path | None, typer.Option(help="Write pictures to this folder.")] = None,
    settings: Annotated[
        Path | None, typer.Option(help="Settings to start from, instead of the defaults.")
    ] = None,
    distance_threshold: DistanceThreshold = None,
    frame_rate_hz: FrameRate = None,
    json_: Annotated[bool, typer.Option("--json", help="Print JSON instead of a table.")] = False,
) -> None:
    """Measure settings: detection probability, clutter, noise, coasting, confirmation.

    Noise is that under which the filter's innovations over each object's detections are likeliest.
    Every value comes with its interval and number of observations; with too few of them the
    default is kept. Held-out frames say whether the covariances are honest.

    Examples:

    margent calibrate data/fog --truth data/fog/truth.csv --out fog.toml

    margent calibrate data/harbour --truth data/harbour/truth.csv --distance-threshold 50
    """
    from tracker.calibration import calibrate as measure
    from tracker.calibration.settings_file import CAUTION, table, write_settings
    from tracker.cli.progress import announce_compiling
    from tracker.log import read_log, read_truth
    from tracker.settings import load_settings

    if not logs:
        raise UsageError("name the detection logs to calibrate from")
    if bool(truth) == self_:
        raise UsageError("give --truth, or --self to learn without it; not both")
    start = load_settings(settings)
    rate = frame_rate_hz or start.time.frame_rate_hz
    read = [read_log(path, frame_rate_hz=rate) for path in logs]
    truths = [read_truth(path) for path in truth] if truth else None
    announce_compiling()
    found = measure(read, truths, settings=start, distance_threshold=distance_threshold)
    if out is not None:
        write_settings(found, out)
        typer.echo(f"settings written to {out}", err=True)
    if plots is not None:
        from tracker.calibration.plots import write_plots

        typer.echo(f"{len(write_plots(found, plots))} pictures written to {plots}", err=True)
    typer.echo(json.dumps(found.as_dict(), indent=2) if json_ else table(found))
    typer.echo(CAUTION, err=True)
