"""`margent evaluate`: scores against truth."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Annotated

import typer

from tracker.errors import LimitError, UsageError


def evaluate(
    tracks: Annotated[
        list[Path],
        typer.Argument(
            metavar="RUN|TRACKS...",
            help="Run folders, folders of run folders, or files with tracks.",
        ),
    ],
    truth: Annotated[
        list[str],
        typer.Option(
            metavar="TRUTH",
            help="Truth file; for several sequences repeat it in their order, give NAME=FILE, or "
            "one folder that holds NAME/truth.* for each.",
        ),
    ],
    iou_threshold: Annotated[
        float, typer.Option(help="Least IoU at which a box counts as on its object.")
    ] = 0.5,
    distance_threshold: Annotated[
        float | None,
        typer.Option(help="Points: largest distance that counts, in the log's own unit."),
    ] = None,
    score_class: Annotated[
        list[str] | None,
        typer.Option(help="Score only truth with this label. Repeatable."),
    ] = None,
    ignore_class: Annotated[
        list[str] | None,
        typer.Option(help="Take out track boxes that lie on truth with this label. Repeatable."),
    ] = None,
    coasting: Annotated[
        str, typer.Option(help="Count coasting rows: 'as-reported', 'yes' or 'no'.")
    ] = "as-reported",
    referee: Annotated[
        str,
        typer.Option(
            help="'on': motmetrics counts too and must agree. 'off': for sizes beyond its memory "
            "(about 0.6 GB for a million pairs that may match, and 3.4 GB for 10,000 objects and "
            "tracks together, growing with their square)."
        ),
    ] = "on",
    limit: Annotated[
        list[str] | None,
        typer.Option(
            help="Hold an overall score to a limit, such as 'idf1>=0.72' or 'switches<=10'; "
            "exit code 1 if it is not met. Names as --json has them. Repeatable."
        ),
    ] = None,
    limits: Annotated[
        Path | None,
        typer.Option(
            help="TOML file of limits: tables [overall], [every] (each sequence) and "
            '[sequences.NAME] with lines such as idf1 = ">=0.72".'
        ),
    ] = None,
    junit: Annotated[
        Path | None, typer.Option(help="Write the limits' outcome as JUnit XML to this file.")
    ] = None,
    json_: Annotated[bool, typer.Option("--json", help="Print JSON instead of a table.")] = False,
) -> None:
    """Score tracks against truth: HOTA, MOTA, MOTP (a distance), IDF1, switches and the rest.

    Truth in the public benchmark layout with classes is scored on class 1,
    with classes 2, 7, 8 and 12 ignored, unless classes are chosen. Track rows in frames that the
    truth does not reach count as false positives.

    Example: margent evaluate runs/forecourt --truth sample_sequences/forecourt/truth.csv
    """
    from tracker.cli.sequences import tracks_by_name, truths_by_name
    from tracker.evaluation import Scope, evaluate_all
    from tracker.evaluation.junit import write_junit
    from tracker.evaluation.limits import judge, parse_limit, read_limits, verdict_table
    from tracker.evaluation.table import CAUTION, LEGEND, scores_table

    counted = {"as-reported": None, "yes": True, "no": False}
    if coasting not in counted:
        raise UsageError(f"--coasting takes 'as-reported', 'yes' or 'no', found {coasting!r}")
    if referee not in ("on", "off"):
        raise UsageError(f"--referee takes 'on' or 'off', found {referee!r}")
    scope = Scope(
        iou_threshold,
        distance_threshold,
        tuple(score_class) if score_class else None,
        tuple(ignore_class or ()),
        counted[coasting],
    )
    asked = [parse_limit(text) for text in limit or ()]
    if junit is not None and not asked and limits is None:
        raise UsageError("--junit reports limits: give --limit or --limits")
    sequences = tracks_by_name(tracks)
    if limits is not None:
        asked += read_limits(limits, list(sequences))
    truths = truths_by_name(truth, list(sequences))
    found = evaluate_all(
        {name: (sequences[name], truths[name]) for name in truths},
        scope,
        with_referee=referee == "on",
    )
    verdicts = judge(found, asked)
    if json_:
        verdict_part = {"limits": [verdict.as_dict() for verdict in verdicts]} if asked else {}
        typer.echo(json.dumps(found.as_dict() | verdict_part, indent=2))
    else:
        typer.echo(scores_table(found))
        if asked:
            typer.echo("\n" + verdict_table(verdicts))
        typer.echo(LEGEND, err=True)
        typer.echo(CAUTION, err=True)
    if junit is not None:
        write_junit(junit, verdicts)
    missed = [verdict for verdict in verdicts if not verdict.met]
    if missed:
        first = missed[0]
        value = "no value" if first.found is None else f"{first.found:.6g}"
        raise LimitError(
            f"{len(missed)} of {len(verdicts)} limits not met, the first: {first.where}, "
            f"{first.limit.words} (found {value})"
        )
