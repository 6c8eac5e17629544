"""Small tracks and truth made of rows, for checks by hand."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import Any

import numpy as np

from tracker.log import Kind, SequenceFacts, Truth, box_centre
from tracker.results import Tracks, TrackState

Row = Sequence[float]  # frame, id, left, top, width, height   or   frame, id, x, y


def _parts(rows: Sequence[Row], kind: Kind) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    table = np.array(rows, np.float64).reshape(-1, 2 + kind.dimension)
    z = box_centre(table[:, 2:]) if kind is Kind.BOX else table[:, 2:].copy()
    return table[:, 0].astype(np.int64), table[:, 1].astype(np.int64), z


def make_tracks(rows: Sequence[Row], kind: Kind = Kind.BOX, **columns: Any) -> Tracks:
    """Tracks in the order of the rows; `columns` replaces any column."""
    frame, track, z = _parts(rows, kind)
    count = len(frame)
    values: dict[str, Any] = {
        "name": "made",
        "kind": kind,
        "facts": SequenceFacts(),
        "frame": frame,
        "time": frame / 10.0,
        "track": track,
        "z": z,
        "score": np.full(count, np.nan),
        "label": np.full(count, -1, np.int32),
        "labels": (),
        "state": np.full(count, TrackState.CONFIRMED, np.int8),
        "reported": np.ones(count, np.bool_),
        "line": np.full(count, -1, np.int64),
    }
    return Tracks(**(values | columns))


def make_truth(
    rows: Sequence[Row], kind: Kind = Kind.BOX, words: Sequence[str] = (), **columns: Any
) -> Truth:
    """Truth in the order of the rows; `words` gives their labels, `columns` replaces any column."""
    frame, identity, z = _parts(rows, kind)
    names, dense = np.unique(identity, return_inverse=True)
    labels = tuple(sorted(set(words)))
    count = len(frame)
    values: dict[str, Any] = {
        "name": "made",
        "path": Path("truth.csv"),
        "digest": "",
        "format": "csv",
        "kind": kind,
        "facts": SequenceFacts(),
        "frame": frame,
        "time": None,
        "object": dense.astype(np.int64),
        "object_names": tuple(str(name) for name in names.tolist()),
        "z": z,
        "label": np.array([labels.index(word) for word in words] or [-1] * count, np.int32),
        "labels": labels,
        "line": np.arange(count),
        "scored": np.ones(count, np.bool_),
        "visibility": np.full(count, np.nan),
    }
    return Truth(**(values | columns))


def standing(frames: Sequence[int], identity: int, left: float = 0.0) -> list[Row]:
    """A box of 10 by 20 that stands still."""
    return [(frame, identity, left, 0.0, 10.0, 20.0) for frame in frames]


def random_scene(
    seed: int, *, frames: int = 30, objects: int = 8, kind: Kind = Kind.BOX, ties: bool = False
) -> tuple[Tracks, Truth]:
    """Crowded objects, and tracks of them with misses, wrong ids, clutter and identity changes.

    ties : everything on a coarse grid, so that equal distances are common.
    """
    rng = np.random.default_rng(seed)
    side = 12.0 * np.sqrt(objects)
    place = rng.uniform(0, side, (objects, 2))
    speed = rng.normal(0, 1.0, (objects, 2))
    identity = np.arange(objects)
    next_identity = objects
    true_rows: list[Row] = []
    track_rows: list[Row] = []
    for frame in range(1, frames + 1):
        centre = place + speed * frame
        if ties:
            centre = np.round(centre / 4) * 4
        seen = rng.random(objects) < 0.9
        true_rows += [_row(frame, k, centre[k], kind) for k in np.flatnonzero(seen).tolist()]
        for k in range(objects):
            if rng.random() < 0.05:
                identity[k] = next_identity
                next_identity += 1
            if rng.random() < 0.03:
                other = int(rng.integers(objects))
                identity[k], identity[other] = identity[other], identity[k]
        noise = rng.normal(0, 1.5, (objects, 2))
        found = centre + (np.round(noise / 4) * 4 if ties else noise)
        tracked = rng.random(objects) < 0.85
        track_rows += [
            _row(frame, int(identity[k]), found[k], kind) for k in np.flatnonzero(tracked).tolist()
        ]
        for k in range(int(rng.poisson(1.0))):
            track_rows.append(_row(frame, 10_000 + 50 * frame + k, rng.uniform(0, side, 2), kind))
    return make_tracks(sorted(track_rows), kind), make_truth(sorted(true_rows), kind)


def _row(frame: int, identity: int, centre: np.ndarray, kind: Kind) -> Row:
    if kind is Kind.POINT:
        return (frame, identity, float(centre[0]), float(centre[1]))
    return (frame, identity, float(centre[0]) - 5, float(centre[1]) - 10, 10.0, 20.0)
