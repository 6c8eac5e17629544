"""Track rows as Arrow tables: one for people (CSV), one for programs (Parquet)."""

from __future__ import annotations

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from tracker.log.model import Codes, Floats, Kind, box_corner
from tracker.results.recorder import TrackRows
from tracker.results.tracks import TrackState

# Digits behind the point in tracks.csv; tracks.parquet has every bit.
CSV_DECIMALS = {Kind.BOX: 3, Kind.POINT: 6}
STATE_WORDS = pa.array([state.word for state in TrackState])


def csv_table(rows: TrackRows, kind: Kind, labels: tuple[str, ...]) -> pa.Table:
    """What tracks.csv shows of some rows."""
    decimals = CSV_DECIMALS[kind]
    columns: dict[str, pa.Array] = {
        "frame": pa.array(rows.frame),
        "time": pa.array(np.round(rows.time, 6)),
        "track": pa.array(rows.track),
    }
    shown = np.round(_as_written(rows.z, kind), decimals)
    for k, name in enumerate(kind.columns):
        columns[name] = pa.array(shown[:, k])
    columns |= {
        "score": missing_if_nan(rows.score),
        "label": label_words(rows.label, labels),
        "confidence": missing_if_nan(np.round(rows.confidence, 4)),
        "state": STATE_WORDS.take(pa.array(rows.state)),
        "reported": pa.array(rows.reported.astype(np.int8)),
        "line": pa.array(rows.line, mask=rows.line < 0),
    }
    return pa.table(columns)


def parquet_table(rows: TrackRows, kind: Kind, labels: tuple[str, ...]) -> pa.Table:
    """What tracks.parquet holds of some rows: all of it, covariances included.

    `estimate` is in filter order (for boxes centre x, centre y, width, height), `covariance` the
    upper triangle of its covariance, row by row.
    """
    columns: dict[str, pa.Array] = {
        "frame": pa.array(rows.frame),
        "time": pa.array(rows.time),
        "track": pa.array(rows.track),
    }
    shown = _as_written(rows.z, kind)
    for k, name in enumerate(kind.columns):
        columns[name] = pa.array(shown[:, k])
    for k, name in enumerate(rate_names(kind)):
        columns[name] = pa.array(rows.rate[:, k])
    columns |= {
        "score": missing_if_nan(rows.score),
        "label": label_words(rows.label, labels),
        "confidence": missing_if_nan(rows.confidence),
        "state": STATE_WORDS.take(pa.array(rows.state)),
        "reported": pa.array(rows.reported),
        "line": pa.array(rows.line, mask=rows.line < 0),
        "estimate": lists(rows.estimate),
        "covariance": lists(rows.covariance),
    }
    return pa.table(columns)


def rate_names(kind: Kind) -> tuple[str, ...]:
    """Columns of the velocity estimate, per second."""
    return {
        Kind.BOX: ("rate_x", "rate_y", "rate_width", "rate_height"),
        Kind.POINT: ("rate_x", "rate_y"),
    }[kind]


def label_words(codes: Codes, labels: tuple[str, ...]) -> pa.Array:
    """Label texts, null for code -1."""
    words = pa.array(labels, pa.string())
    return words.take(pa.array(codes, mask=codes < 0))


def lists(values: Floats) -> pa.Array:
    """(n, k) numbers as n lists of k."""
    flat = pa.array(np.ascontiguousarray(values).ravel())
    return pa.FixedSizeListArray.from_arrays(flat, values.shape[1])


def _as_written(z: Floats, kind: Kind) -> Floats:
    return box_corner(z) if kind is Kind.BOX else z


def missing_if_nan(values: Floats) -> pa.Array:
    """Numbers, null for nan."""
    missing: NDArray[np.bool_] = np.isnan(values)
    return pa.array(values, mask=missing)
