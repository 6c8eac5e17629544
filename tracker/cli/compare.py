"""`margent compare`: is one run better than another, and where."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Annotated

import typer

from tracker.cli.scoring import (
    Coasting,
    DistanceThreshold,
    FrameStride,
    IgnoreClass,
    IgnoreRegion,
    IouThreshold,
    Referee,
    ScoreClass,
    Strict,
    TruthFiles,
    VisibilityFloor,
    Workers,
    scopes_of,
    wants_referee,
)
from tracker.errors import LimitError, UsageError

SUITE = "margent compare"


def compare(
    run_a: Annotated[
        Path,
        typer.Argument(
            metavar="RUN_A",
            help="The old run: a run folder, a folder of run folders, or a file with tracks.",
        ),
    ],
    run_b: Annotated[Path, typer.Argument(metavar="RUN_B", help="The new run, likewise.")],
    truth: TruthFiles,
    iou_threshold: IouThreshold = 0.5,
    distance_threshold: DistanceThreshold = None,
    score_class: ScoreClass = None,
    ignore_class: IgnoreClass = None,
    ignore_region: IgnoreRegion = None,
    visibility_floor: VisibilityFloor = None,
    frame_stride: FrameStride = None,
    coasting: Coasting = "as-reported",
    referee: Referee = "on",
    workers: Workers = 1,
    strict: Strict = False,
    block_seconds: Annotated[
        float | None,
        typer.Option(
            help="Resample blocks of time of this length, of all sequences together; longer than "
            "errors usually last. Without it: whole sequences where there are 8 or more, else "
            "blocks of 5 s."
        ),
    ] = None,
    resamples: Annotated[int, typer.Option(help="How often to resample.")] = 2000,
    confidence: Annotated[float, typer.Option(help="Confidence of the intervals.")] = 0.95,
    seed: Annotated[int, typer.Option(min=0, help="Seed of the resampling.")] = 0,
    no_worse_than: Annotated[
        list[str] | None,
        typer.Option(
            metavar="NAME=TOLERANCE",
            help="B's overall score may be worse than A's by at most this, such as 'idf1=0.005', "
            "'idf1=0.5%' or 'switches=3'; exit code 1 if not. Names as --json has them. "
            "Repeatable.",
        ),
    ] = None,
    by_interval: Annotated[
        bool,
        typer.Option(
            "--by-interval",
            help="Let the worse end of the interval decide about --no-worse-than, not the "
            "difference found: B passes only if the data rule out that it is worse by more.",
        ),
    ] = False,
    junit: Annotated[
        Path | None,
        typer.Option(help="Write the outcome of --no-worse-than as JUnit XML to this file."),
    ] = None,
    show_objects: Annotated[
        int, typer.Option(min=0, help="How many changed objects to print.")
    ] = 10,
    objects: Annotated[
        Path | None,
        typer.Option(
            metavar="FILE",
            help="Write all objects with both runs' counts to this file (tabs if it ends in "
            ".tsv, else commas).",
        ),
    ] = None,
    json_: Annotated[bool, typer.Option("--json", help="Print JSON instead of tables.")] = False,
) -> None:
    """Compare two runs: the difference of every score and how sure it is, objects, frames.

    Sequences go together by name. The interval comes from a paired bootstrap: sequences (or
    blocks of time) are drawn with replacement, the same for both runs, their counts are added and
    the scores formed of the sums. Also: the objects that got better or worse, the first frame in
    which the runs part, and the settings that differ.

    Examples:

    margent compare runs/old runs/new --truth sample_sequences

    margent compare runs/old runs/new --truth sample_sequences --no-worse-than idf1=0.005
    """
    from tracker.cli.progress import announce_compiling, watched
    from tracker.cli.sequences import pairs_by_name, truths_by_name
    from tracker.comparison import (
        changed_settings,
        changed_sources,
        judge,
        parse_tolerance,
        write_objects,
    )
    from tracker.comparison import compare as compare_runs
    from tracker.comparison.bootstrap import check_resampling
    from tracker.comparison.table import (
        LEGEND,
        changes_table,
        explain_commands,
        judgements_table,
        objects_table,
        partings_text,
        resampling_words,
        sequences_table,
        settings_table,
    )
    from tracker.evaluation.junit import write_junit
    from tracker.evaluation.remarks import remarks, told_once
    from tracker.evaluation.table import CAUTION
    from tracker.results import is_run

    with_referee = wants_referee(referee)
    check_resampling(resamples, confidence, block_seconds)
    tolerances = [parse_tolerance(text) for text in no_worse_than or ()]
    for flag, given in (("--junit", junit is not None), ("--by-interval", by_interval)):
        if given and not tolerances:
            raise UsageError(f"{flag} is about --no-worse-than: give a tolerance")
    pairs = pairs_by_name(run_a, run_b)
    names = list(pairs)
    scopes = scopes_of(
        names,
        iou_threshold=iou_threshold,
        distance_threshold=distance_threshold,
        score_class=score_class,
        ignore_class=ignore_class,
        ignore_region=ignore_region,
        visibility_floor=visibility_floor,
        frame_stride=frame_stride,
        coasting=coasting,
    )
    truths = truths_by_name(truth, names, strict=strict)
    announce_compiling()
    found = compare_runs(
        {name: (a, b, truths[name]) for name, ((_, a), (_, b)) in pairs.items()},
        scopes,
        block_seconds=block_seconds,
        resamples=resamples,
        confidence=confidence,
        seed=seed,
        with_referee=with_referee,
        workers=workers,
        watch=lambda done, total: watched(done, total=total, label="sequences"),
    )
    paths = {name: (a, b) for name, ((a, _), (b, _)) in pairs.items()}
    runs = {name: pair for name, pair in paths.items() if all(map(is_run, pair))}
    settings = changed_settings(runs)
    judgements = judge(found.overall, tolerances, by_interval=by_interval)
    said = {
        name: dict.fromkeys(
            sentence
            for side in (found.a, found.b)
            for sentence in remarks(truths[name], scopes[name], side.sequences[name])
        )
        for name in names
    }
    for sentence in told_once({name: list(own) for name, own in said.items()}):
        typer.echo(sentence, err=True)
    notes = [*changed_sources(runs), *found.notes]
    for sentence in notes:
        typer.echo(f"note: {sentence}", err=True)
    if json_:
        answer = {"a": str(run_a), "b": str(run_b)} | found.as_dict() | {"notes": notes}
        for name, parting in found.partings.items():
            answer["partings"][name]["commands"] = explain_commands(parting, paths[name])
        answer["settings"] = [item.as_dict() for item in settings]
        if tolerances:
            answer["no_worse_than"] = [item.as_dict() for item in judgements]
        typer.echo(json.dumps(answer, indent=2))
    else:
        typer.echo(f"A: {run_a}\nB: {run_b}\n\n{changes_table(found)}")
        if found.resampling is not None:
            typer.echo(resampling_words(found))
        if len(pairs) > 1:
            typer.echo("\n" + sequences_table(found))
        if runs:
            typer.echo("\n" + settings_table(settings, len(runs)))
        typer.echo("\n" + partings_text(found, paths))
        typer.echo("\n" + objects_table(found, show_objects))
        if tolerances:
            typer.echo("\n" + judgements_table(judgements))
        typer.echo(LEGEND, err=True)
        typer.echo(CAUTION, err=True)
    if objects is not None:
        write_objects(objects, found.objects)
    if junit is not None:
        write_junit(junit, judgements, SUITE)
    missed = [item for item in judgements if not item.met]
    if missed:
        raise LimitError(
            f"{len(missed)} of {len(judgements)} tolerances not met, the first: {missed[0].name} "
            f"(found: {missed[0].found})"
        )
