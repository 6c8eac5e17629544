"""Options of the commands that score tracks against truth, each said once."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from tracker.errors import UsageError

if TYPE_CHECKING:
    from tracker.evaluation import Scope

TruthFiles = Annotated[
    list[str],
    typer.Option(
        "--truth",
        metavar="TRUTH",
        help="Truth file; for several sequences repeat it in their order, give NAME=FILE, or "
        "one folder that holds NAME/truth.* for each.",
    ),
]
IouThreshold = Annotated[
    float, typer.Option(help="Least IoU at which a box counts as on its object.")
]
DistanceThreshold = Annotated[
    float | None,
    typer.Option(help="Points: largest distance that counts, in the log's own unit."),
]
ScoreClass = Annotated[
    list[str] | None,
    typer.Option(help="Score only truth with this label. Repeatable."),
]
IgnoreClass = Annotated[
    list[str] | None,
    typer.Option(help="Take out track boxes that lie on truth with this label. Repeatable."),
]
IgnoreRegion = Annotated[
    list[str] | None,
    typer.Option(
        metavar="[NAME=]FILE",
        help="Do not score what lies (by its centre) in these polygons, of all sequences or of "
        "one: TOML with [[region]] points = [[x, y], ...], GeoJSON or WKT. Repeatable.",
    ),
]
VisibilityFloor = Annotated[
    float | None, typer.Option(help="Ignore truth that is less visible than this, 0 to 1.")
]
FrameStride = Annotated[
    int | None,
    typer.Option(
        help="Score every k-th annotated frame and no other; 1 leaves out frames without truth."
    ),
]
Coasting = Annotated[str, typer.Option(help="Count coasting rows: 'as-reported', 'yes' or 'no'.")]
Referee = Annotated[
    str,
    typer.Option(
        help="'on': motmetrics counts too and must agree. 'off': for sizes beyond its memory "
        "(about 0.6 GB for a million pairs that may match, and 3.4 GB for 10,000 objects and "
        "tracks together, growing with their square)."
    ),
]
Strict = Annotated[
    bool,
    typer.Option("--strict", help="Stop with exit code 2 if any row of truth is rejected."),
]
Workers = Annotated[int, typer.Option(min=1, help="Processes; each takes whole sequences.")]


def scopes_of(
    names: list[str],
    *,
    iou_threshold: float,
    distance_threshold: float | None,
    score_class: list[str] | None,
    ignore_class: list[str] | None,
    ignore_region: list[str] | None,
    visibility_floor: float | None,
    frame_stride: int | None,
    coasting: str,
) -> dict[str, Scope]:
    """The scope of each sequence, from the options."""
    from tracker.evaluation import Scope

    counted = {"as-reported": None, "yes": True, "no": False}
    if coasting not in counted:
        raise UsageError(f"--coasting takes 'as-reported', 'yes' or 'no', found {coasting!r}")
    scope = Scope(
        iou_threshold,
        distance_threshold,
        tuple(score_class) if score_class else None,
        tuple(ignore_class or ()),
        counted[coasting],
        visibility_floor=visibility_floor,
        frame_stride=frame_stride,
    )
    return _with_regions(scope, names, ignore_region or [])


def wants_referee(word: str) -> bool:
    """Whether motmetrics counts too."""
    if word not in ("on", "off"):
        raise UsageError(f"--referee takes 'on' or 'off', found {word!r}")
    return word == "on"


def _with_regions(scope: Scope, names: list[str], given: list[str]) -> dict[str, Scope]:
    """The scope of each sequence, with the regions for all and its own."""
    from tracker.evaluation import read_regions

    scopes = dict.fromkeys(names, scope)
    for text in given:
        name, equals, file = text.partition("=")
        one = bool(equals) and name in names
        if equals and not one and not Path(text).exists() and Path(file).exists():
            raise UsageError(
                f"--ignore-region: there is no sequence '{name}' here ({', '.join(names)})"
            )
        regions = read_regions(Path(file if one else text))
        for target in [name] if one else names:
            own = scopes[target]
            scopes[target] = replace(own, regions_ignored=own.regions_ignored + regions)
    return scopes
