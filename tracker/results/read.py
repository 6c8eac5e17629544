"""Read a run folder back."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq

from tracker.errors import InputError
from tracker.log.model import Floats, Kind, SequenceFacts, box_centre
from tracker.results.tracks import TRACKS, TRACKS_ONLINE, Tracks, TrackState


def is_run(path: str | Path) -> bool:
    """Whether a path is a run folder."""
    return (Path(path) / "run.json").is_file()


def read_facts(folder: str | Path) -> dict[str, Any]:
    """run.json of a run folder. Raises InputError if there is none or it is damaged."""
    path = Path(folder) / "run.json"
    try:
        return json.loads(path.read_text(encoding="utf-8"))
    except FileNotFoundError:
        raise InputError(
            "is not a run folder (no run.json)",
            path=folder,
            remedy="Make one with 'margent associate LOG --out DIR'.",
        ) from None
    except (OSError, ValueError) as error:
        raise InputError(f"cannot be read: {error}", path=path) from None


def looked_back(folder: str | Path) -> bool:
    """Whether a run's tracks were decided anew once its log was over."""
    return (Path(folder) / f"{TRACKS_ONLINE}.parquet").is_file()


def read_run(folder: str | Path, *, online: bool = False) -> Tracks:
    """The tracks of a run folder. Raises InputError if it is not one.

    online : the engine's own tracks, of which the ledger speaks, where the run looked back.
    """
    facts = read_facts(folder)
    name = TRACKS_ONLINE if online and looked_back(folder) else TRACKS
    path = Path(folder) / f"{name}.parquet"
    try:
        table = pq.read_table(path)
        kind = Kind(facts["kind"])
        sequence = _sequence(facts["sequence"])
        z = np.column_stack([_floats(table[name]) for name in kind.columns])
    except (OSError, KeyError, ValueError, TypeError) as error:
        raise InputError(f"cannot be read as a run: {error}", path=path) from None
    labels = tuple(sorted({word for word in table["label"].unique().to_pylist() if word}))
    codes = {word: code for code, word in enumerate(labels)} | {None: -1}
    words = table["label"].to_pylist() if labels else [None] * len(table)
    state_codes = {state.word: int(state) for state in TrackState}
    return Tracks(
        name=facts["name"],
        kind=kind,
        facts=sequence,
        frame=table["frame"].to_numpy(),
        time=_floats(table["time"]),
        track=table["track"].to_numpy(),
        z=box_centre(z) if kind is Kind.BOX else z,
        score=_floats(table["score"]),
        label=np.array([codes[word] for word in words], np.int32),
        labels=labels,
        state=np.array([state_codes[word] for word in table["state"].to_pylist()], np.int8),
        reported=table["reported"].to_numpy().astype(np.bool_),
        line=table["line"].fill_null(-1).to_numpy(),
    )


def _sequence(facts: dict[str, Any]) -> SequenceFacts:
    """JSON has lists where facts have tuples."""
    zones = facts.get("exit_zones", ())
    return SequenceFacts(
        **facts | {"exit_zones": tuple(tuple((x, y) for x, y in zone) for zone in zones)}
    )


def square_matrices(triangles: pa.ChunkedArray, dimension: int) -> Floats:
    """(n, d, d) symmetric matrices from lists of their upper triangles, row by row."""
    row, other = np.triu_indices(dimension)
    upper = triangles.combine_chunks().flatten().to_numpy().reshape(-1, len(row))
    square = np.empty((len(upper), dimension, dimension))
    square[:, row, other] = upper
    square[:, other, row] = upper
    return square


def _floats(column: Any) -> np.ndarray:
    return np.array(column.to_numpy(), np.float64)
