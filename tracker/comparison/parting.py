"""The first frame in which two runs part.

Rows of both runs are the same row where they come from the same line of the same log; where lines
say nothing (other logs, plain track files, coasting rows) where they lie closest to each other in
their frame, within the thresholds of the scores. Up to the frame where they part, the runs say the
same, so each track of A is one track of B: the identities are mapped by that.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import asdict, dataclass, replace
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from tracker.evaluation.clearmot import pair_frames
from tracker.evaluation.frames import side_by_side
from tracker.evaluation.scope import Scope, close_pairs, counted_rows
from tracker.log.model import Floats, Ints, Kind, Truth
from tracker.results.tracks import Tracks

# Places that differ by less are the same: tracks.csv has three digits of boxes.
SAME_PLACE = 1e-3
TRUSTED_LINES = 0.95  # common practice, no source: share of common lines that lie on each other


@dataclass(frozen=True, slots=True)
class Difference:
    """One thing that differs in a frame.

    kind : `only-a`, `only-b` (a row that the other run does not report) or `identity`.
    track_a, track_b : None where the run has no row.   line : in the log, None if
    unknown.   place : of the centre.
    known_a, known_b : until then, the track of A that was B's `track_b`, and the track of B that
    was A's `track_a`; None where there was none.
    """

    kind: str
    track_a: int | None
    track_b: int | None
    line: int | None
    place: tuple[float, float]
    known_a: int | None = None
    known_b: int | None = None

    @property
    def words(self) -> str:
        """The difference as a sentence."""
        row = f"line {self.line}" if self.line is not None else "the row"
        at = ", ".join(f"{value:.6g}" for value in self.place)
        if self.kind != "identity":
            run, track = ("A", self.track_a) if self.kind == "only-a" else ("B", self.track_b)
            return f"only {run} reports {row} at ({at}), as its track {track}"
        text = f"{row} at ({at}) is A's track {self.track_a}"
        if self.known_b is not None and self.known_b != self.track_b:
            text += f" (until then B's {self.known_b})"
        text += f" and B's track {self.track_b}"
        if self.known_a is not None and self.known_a != self.track_a:
            text += f" (until then A's {self.known_a})"
        return text

    def as_dict(self) -> dict[str, Any]:
        return asdict(self) | {"words": self.words}


@dataclass(frozen=True, slots=True)
class Parting:
    """Where two runs part.

    frame, time : the first frame in which they report different rows or identities, None if they
    never do.   by : whether rows were told by `line` or by `place`.   moved_frame : the first
    frame in which a row of both lies elsewhere, None if none does.   moved_by : how far at most,
    there.
    """

    frame: int | None
    time: float | None
    differences: tuple[Difference, ...]
    by: str
    moved_frame: int | None
    moved_by: float | None

    def as_dict(self) -> dict[str, Any]:
        return asdict(self) | {"differences": [item.as_dict() for item in self.differences]}


def find_parting(a: Tracks, b: Tracks, scope: Scope) -> Parting:
    """Compare the rows of two runs over one sequence that count as output."""
    a, b = (_only(part, counted_rows(part, scope)) for part in (a, b))
    both = _by_line(a, b, scope)
    by = "place" if both is None else "line"
    at_a, at_b = _by_place(a, b, scope) if both is None else both
    alone_a, alone_b = _left(at_a, len(a)), _left(at_b, len(b))
    if both is not None and len(alone_a) and len(alone_b):  # coasting rows have no line
        blind_a, blind_b = alone_a[a.line[alone_a] < 0], alone_b[b.line[alone_b] < 0]
        more_a, more_b = _by_place(_only(a, blind_a), _only(b, blind_b), scope)
        at_a = np.concatenate((at_a, blind_a[more_a]))
        at_b = np.concatenate((at_b, blind_b[more_b]))
        alone_a, alone_b = _left(at_a, len(a)), _left(at_b, len(b))
    order = np.lexsort((a.track[at_a], a.frame[at_a]))
    at_a, at_b = at_a[order], at_b[order]
    known_b, known_a = _known(a.track[at_a], b.track[at_b]), _known(b.track[at_b], a.track[at_a])
    swapped = (known_b != b.track[at_b]) | (known_a != a.track[at_a])
    moved = np.abs(a.z[at_a] - b.z[at_b]).max(axis=1, initial=0.0)
    moved_frame = _first(a.frame[at_a][moved > SAME_PLACE])
    frames = [a.frame[alone_a], b.frame[alone_b], a.frame[at_a][swapped]]
    frame = _first(np.concatenate(frames))
    found = (
        []
        if frame is None
        else [
            *_alone(a, alone_a[a.frame[alone_a] == frame], "only-a"),
            *_alone(b, alone_b[b.frame[alone_b] == frame], "only-b"),
        ]
    )
    for k in np.flatnonzero(swapped & (a.frame[at_a] == frame)).tolist():
        row, other = int(at_a[k]), int(at_b[k])
        found.append(
            Difference(
                "identity",
                int(a.track[row]),
                int(b.track[other]),
                *_where(a, row),
                known_a=int(known_a[k]),
                known_b=int(known_b[k]),
            )
        )
    times = np.concatenate((a.time[a.frame == frame], b.time[b.frame == frame]))
    there = a.frame[at_a] == moved_frame
    return Parting(
        frame,
        float(times[0]) if len(times) else None,
        tuple(sorted(found, key=lambda item: (item.kind != "identity", item.kind))),
        by,
        moved_frame,
        float(moved[there].max()) if there.any() else None,
    )


def _alone(tracks: Tracks, rows: Ints, kind: str) -> Iterator[Difference]:
    """Rows that the other run does not report."""
    for row in rows.tolist():
        track, a_row = int(tracks.track[row]), kind == "only-a"
        line, place = _where(tracks, row)
        yield Difference(kind, track if a_row else None, None if a_row else track, line, place)


def _by_line(a: Tracks, b: Tracks, scope: Scope) -> tuple[Ints, Ints] | None:
    """Rows of both that come from the same line; None where lines do not tell.

    Lines are trusted where each is there once, no common line is in two frames, and nearly all
    common rows lie on each other.
    """
    lines = []
    for part in (a, b):
        some = np.flatnonzero(part.line >= 0)
        if not len(some) or len(np.unique(part.line[some])) < len(some):
            return None
        lines.append(some)
    _, at_a, at_b = np.intersect1d(a.line[lines[0]], b.line[lines[1]], return_indices=True)
    at_a, at_b = lines[0][at_a], lines[1][at_b]
    if not len(at_a) or np.any(a.frame[at_a] != b.frame[at_b]):
        return None
    if np.mean(_near(a.z[at_a], b.z[at_b], a.kind, scope)) < TRUSTED_LINES:
        return None
    return at_a, at_b


def _near(a: Floats, b: Floats, kind: Kind, scope: Scope) -> NDArray[np.bool_]:
    """(n,) whether two rows would pair at the thresholds of the scores."""
    if kind is Kind.POINT:
        return np.hypot(*(a - b).T) <= (scope.distance_threshold or 0.0)
    low = np.maximum(a[:, :2] - a[:, 2:] / 2, b[:, :2] - b[:, 2:] / 2)
    high = np.minimum(a[:, :2] + a[:, 2:] / 2, b[:, :2] + b[:, 2:] / 2)
    shared = np.maximum(high - low, 0.0).prod(axis=1)
    return shared >= scope.iou_threshold * (a[:, 2:].prod(axis=1) + b[:, 2:].prod(axis=1) - shared)


def _by_place(a: Tracks, b: Tracks, scope: Scope) -> tuple[Ints, Ints]:
    """Rows of both that lie closest to each other, each frame on its own."""
    if not len(a) or not len(b):
        return np.zeros(0, np.int64), np.zeros(0, np.int64)
    both = side_by_side(
        b,
        _as_truth(a),
        np.ones(len(b), np.bool_),
        least_iou=scope.iou_threshold,
        reach=scope.distance_threshold or np.inf,
    )
    scene = both.only_pairs(close_pairs(both, a.kind, scope))
    match = pair_frames(scene, both.objects, keep=False)
    paired = match >= 0
    return both.truth_row[paired], both.track_row[scene.pair_row[match[paired]]]


def _as_truth(tracks: Tracks) -> Truth:
    """Tracks as the other side of a comparison."""
    names, dense = np.unique(tracks.track, return_inverse=True)
    return Truth(
        name=tracks.name,
        path=Path(tracks.name),
        digest="",
        format="",
        kind=tracks.kind,
        facts=tracks.facts,
        frame=tracks.frame,
        time=None,
        object=dense.astype(np.int64),
        object_names=tuple(map(str, names.tolist())),
        z=tracks.z,
        label=tracks.label,
        line=tracks.line,
        scored=np.ones(len(tracks), np.bool_),
        visibility=np.full(len(tracks), np.nan),
        labels=tracks.labels,
    )


def _only(tracks: Tracks, rows: NDArray[np.bool_] | Ints) -> Tracks:
    """The tracks with only these rows."""
    columns = ("frame", "time", "track", "z", "score", "label", "state", "reported", "line")
    return replace(tracks, **{name: getattr(tracks, name)[rows] for name in columns})


def _left(rows: Ints, count: int) -> Ints:
    """The rows that are not among those."""
    return np.setdiff1d(np.arange(count), rows, assume_unique=True)


def _known(track: Ints, other: Ints) -> Ints:
    """(n,) what each track was together with first; rows in order of frame."""
    _, first, which = np.unique(track, return_index=True, return_inverse=True)
    return other[first][which]


def _first(frames: Ints) -> int | None:
    return int(frames.min()) if len(frames) else None


def _where(tracks: Tracks, row: int) -> tuple[int | None, tuple[float, float]]:
    """Line and place of a row."""
    line = int(tracks.line[row])
    return None if line < 0 else line, (float(tracks.z[row, 0]), float(tracks.z[row, 1]))
