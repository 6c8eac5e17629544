"""`margent evaluate`: scores against truth."""

from __future__ import annotations

import json
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from tracker.errors import InputError, UsageError

if TYPE_CHECKING:
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
            "(about 1 GB for every million of pairs that could match, and 24 bytes for every "
            "square of objects + tracks)."
        ),
    ] = "on",
    json_: Annotated[bool, typer.Option("--json", help="Print JSON instead of a table.")] = False,
) -> None:
    """Score tracks against truth: HOTA, MOTA, MOTP (a distance), IDF1, switches and the rest.

    Truth in the public benchmark layout with classes is scored on class 1,
    with classes 2, 7, 8 and 12 ignored, unless classes are chosen. Track rows in frames that the
    truth does not reach count as false positives.

    Example: margent evaluate runs/forecourt --truth sample_sequences/forecourt/truth.csv
    """
    from tracker.evaluation import Scope, evaluate_all
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
    sequences = _read_tracks(tracks)
    found = evaluate_all(
        {
            name: (sequences[name], path)
            for name, path in _read_truths(truth, list(sequences)).items()
        },
        scope,
        with_referee=referee == "on",
    )
    if json_:
        typer.echo(json.dumps(found.as_dict(), indent=2))
        return
    typer.echo(scores_table(found))
    typer.echo(LEGEND, err=True)
    typer.echo(CAUTION, err=True)


def _read_tracks(paths: list[Path]) -> dict[str, Tracks]:
    """Tracks by sequence name, in the order given."""
    from tracker.log import read_track_file
    from tracker.results import is_run, read_run

    read: list[tuple[Path, Tracks]] = []
    for path in paths:
        runs = [path]
        if path.is_dir() and not is_run(path):
            runs = sorted(inner for inner in path.iterdir() if is_run(inner))
            if not runs:
                raise InputError(
                    "is neither a run folder nor a folder of them",
                    path=path,
                    remedy="Make one with 'margent associate LOG --out DIR'.",
                )
        read += [(run, read_run(run) if is_run(run) else read_track_file(run)) for run in runs]
    names = _names([(path, tracks.name) for path, tracks in read])
    return dict(zip(names, (tracks for _, tracks in read), strict=True))


def _names(named: list[tuple[Path, str]]) -> list[str]:
    """A name for each: its own, the folder it is in where names are equal, else its path."""
    own = [name for _, name in named]
    folder = [(path if path.is_dir() else path.absolute().parent).name for path, _ in named]
    names = [
        name if own.count(name) == 1 else at if folder.count(at) == 1 else str(path)
        for name, at, (path, _) in zip(own, folder, named, strict=True)
    ]
    twice = next((name for name in names if names.count(name) > 1), None)
    if twice is not None:
        raise UsageError(f"two sets of tracks are called '{twice}'; give each once")
    return names


def _read_truths(given: list[str], names: list[str]) -> dict[str, Truth]:
    """The truth of each sequence, from files in order, NAME=FILE, or a folder."""
    from tracker.log import read_truth

    parts = {text: text.partition("=") for text in given}
    named = {name: file for name, equals, file in parts.values() if equals and name in names}
    plain = [text for text in given if not (parts[text][1] and parts[text][0] in names)]
    if len(plain) == 1 and not named and (len(names) > 1 or Path(plain[0]).is_dir()):
        folder = Path(plain[0])
        if folder.is_dir() and not list(folder.glob("truth.*")):
            return {name: read_truth(_truth_in(folder, name)) for name in names}
    left = [name for name in names if name not in named]
    if len(plain) == 1 and len(left) > 1:
        plain *= len(left)  # several runs over one sequence share its truth
    if len(plain) != len(left):
        raise UsageError(
            f"{len(names)} {'sequence' if len(names) == 1 else 'sequences'} ({', '.join(names)}) "
            f"but {len(given)} truth files; give one each in order, NAME=FILE, or a folder"
        )
    paths = named | dict(zip(left, plain, strict=True))
    return {name: read_truth(Path(paths[name])) for name in names}


def _truth_in(folder: Path, name: str) -> Path:
    for place in (folder / name, folder):
        for pattern in ("truth.*", f"{name}.*") if place == folder / name else (f"{name}.*",):
            files = sorted(place.glob(pattern)) if place.is_dir() else []
            if files:
                return files[0]
    raise InputError(
        f"no truth for the sequence '{name}'",
        path=folder,
        remedy=f"Expected {name}/truth.* or {name}.* in it.",
    )
