"""`margent evaluate`: scores against truth."""

from __future__ import annotations

import json
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

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

if TYPE_CHECKING:
    from tracker.causes import Diagnosis
    from tracker.evaluation import Scope
    from tracker.log.model import Truth
    from tracker.results.tracks import Tracks


def evaluate(
    tracks: Annotated[
        list[Path],
        typer.Argument(
            metavar="RUN|TRACKS...",
            help="Run folders, folders of run folders, or files with tracks.",
        ),
    ],
    truth: TruthFiles,
    iou_threshold: IouThreshold = 0.5,
    distance_threshold: DistanceThreshold = None,
    score_class: ScoreClass = None,
    ignore_class: IgnoreClass = None,
    ignore_region: IgnoreRegion = None,
    visibility_floor: VisibilityFloor = None,
    frame_stride: FrameStride = None,
    per_class: Annotated[
        bool,
        typer.Option(
            help="Score each class of the truth on its own too; the others are ignored meanwhile, "
            "and tracks with their labels left out."
        ),
    ] = False,
    details: Annotated[
        bool,
        typer.Option(
            help="More tables: localisation, GOSPA and OSPA, how long tracks, delays, gaps and "
            "lost identities last, and HOTA at each threshold. --json has these always."
        ),
    ] = False,
    consistency: Annotated[
        bool,
        typer.Option(
            help="Run folders: are the covariances honest? NEES of paired rows against truth and "
            "NIS of the ledger's pairs, with chi-square bounds."
        ),
    ] = False,
    causes: Annotated[
        bool,
        typer.Option(
            help="Run folders: trace every switch, break, miss, late confirmation and false track "
            "to its cause, print a summary and write causes.csv into the run folder."
        ),
    ] = False,
    log: Annotated[
        list[Path] | None,
        typer.Option(
            help="For --causes of runs without a ledger: the detection logs they were made from, "
            "in their order; they are run again with a ledger. Repeatable."
        ),
    ] = None,
    coasting: Coasting = "as-reported",
    referee: Referee = "on",
    self_check: Annotated[
        bool,
        typer.Option(
            help="First score the truth against itself, which must give 100%; exit code 1 if not."
        ),
    ] = False,
    workers: Workers = 1,
    strict: Strict = False,
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

    HOTA is the mean over similarities 0.05, 0.10 ... 0.95 (Luiten et al. 2021). Overall scores
    come from summed counts, never from averaged ratios.

    Truth in the public benchmark layout with classes is scored on class 1,
    with classes 2, 7, 8 and 12 ignored, unless classes are chosen. Track rows in frames that the
    truth does not reach count as false positives.

    Examples:

    margent evaluate runs/forecourt --truth sample_sequences/forecourt/truth.csv

    margent evaluate runs --truth sample_sequences --limit "idf1>=0.72" --junit scores.xml
    """
    from tracker.cli.progress import announce_compiling, watched
    from tracker.cli.sequences import sources_by_name, truths_by_name
    from tracker.evaluation import evaluate_all
    from tracker.evaluation.consistency import check_run, checks_table
    from tracker.evaluation.junit import write_junit
    from tracker.evaluation.limits import judge, parse_limit, read_limits, verdict_table
    from tracker.evaluation.remarks import remarks, told_once
    from tracker.evaluation.table import (
        CAUTION,
        DETAILS_LEGEND,
        LEGEND,
        details_table,
        scores_table,
        thresholds_table,
    )
    from tracker.results import is_run

    with_referee = wants_referee(referee)
    asked = [parse_limit(text) for text in limit or ()]
    if junit is not None and not asked and limits is None:
        raise UsageError("--junit reports limits: give --limit or --limits")
    sources = sources_by_name(tracks)
    sequences = {name: found for name, (_, found) in sources.items()}
    for flag, asked_for in (("--consistency", consistency), ("--causes", causes)):
        for path, _ in sources.values():
            if asked_for and not is_run(path):
                raise UsageError(f"{flag} needs run folders, and {path} is a track file")
    if limits is not None:
        asked += read_limits(limits, list(sequences))
    scopes = scopes_of(
        list(sequences),
        iou_threshold=iou_threshold,
        distance_threshold=distance_threshold,
        score_class=score_class,
        ignore_class=ignore_class,
        ignore_region=ignore_region,
        visibility_floor=visibility_floor,
        frame_stride=frame_stride,
        coasting=coasting,
    )
    truths = truths_by_name(truth, list(sequences), strict=strict)
    announce_compiling()
    if self_check:
        _check_truth(truths, scopes, with_referee)
    found = evaluate_all(
        {name: (sequences[name], truths[name]) for name in truths},
        scopes,
        with_referee=with_referee,
        per_class=per_class,
        workers=workers,
        watch=lambda done, total: watched(done, total=total, label="sequences"),
    )
    said = {
        name: list(remarks(truths[name], scopes[name], scores))
        for name, scores in found.sequences.items()
    }
    for sentence in told_once(said):
        typer.echo(sentence, err=True)
    honest = (
        {name: check_run(sources[name][0], truths[name], scopes[name]) for name in truths}
        if consistency
        else {}
    )
    traced = _trace(sources, truths, scopes, log) if causes else {}
    verdicts = judge(found, asked)
    if json_:
        answer = found.as_dict()
        if consistency:
            answer["consistency"] = {
                name: {kind: check.as_dict() for kind, check in checks.items()}
                for name, checks in honest.items()
            }
        if causes:
            from tracker.causes import summary_dict

            answer["causes"] = {name: summary_dict(item) for name, item in traced.items()}
        if asked:
            answer["limits"] = [verdict.as_dict() for verdict in verdicts]
        typer.echo(json.dumps(answer, indent=2))
    else:
        typer.echo(scores_table(found))
        if details:
            typer.echo("\n" + details_table(found))
            typer.echo("\n" + thresholds_table(found))
        if consistency:
            typer.echo("\n" + checks_table(honest))
        for item in traced.values():
            from tracker.causes import summary_text

            typer.echo("\n" + summary_text(item))
        if asked:
            typer.echo("\n" + verdict_table(verdicts))
        typer.echo(LEGEND, err=True)
        if details:
            typer.echo(DETAILS_LEGEND, err=True)
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


def _trace(
    sources: dict[str, tuple[Path, Tracks]],
    truths: dict[str, Truth],
    scopes: dict[str, Scope],
    logs: list[Path] | None,
) -> dict[str, Diagnosis]:
    """Diagnose every run and write its causes.csv."""
    from tracker.causes import diagnose, with_ledger, write_causes
    from tracker.results.read import looked_back

    if logs is not None and len(logs) != len(sources):
        raise UsageError(f"{len(sources)} runs but {len(logs)} logs; give one each, in order")
    found = {}
    for k, (name, (path, _)) in enumerate(sources.items()):
        if looked_back(path):
            typer.echo(
                f"{name}: note: causes are those of the engine's own tracks (tracks_online); what "
                "is scored are the identities in hindsight",
                err=True,
            )
        with with_ledger(path, logs[k] if logs else None) as folder:
            found[name] = diagnose(folder, truths[name], scopes[name])
        write_causes(found[name], path / "causes.csv")
    return found


def _check_truth(truths: dict[str, Truth], scopes: dict[str, Scope], with_referee: bool) -> None:
    """Score every truth against itself."""
    from tracker.evaluation import is_perfect, self_check

    for name, truth in truths.items():
        scores = self_check(truth, scopes[name], with_referee=with_referee)
        if not is_perfect(scores):
            c = scores.counts
            raise LimitError(
                f"self-check of '{name}': the truth against itself has {c.misses} misses, "
                f"{c.false_positives} false positives, {c.switches} switches and "
                f"{c.truth_boxes - c.identity_matches} wrong identities; do objects lie exactly on "
                "each other?"
            )
        typer.echo(f"self-check of '{name}': 100% ({scores.counts.matches} rows)", err=True)
