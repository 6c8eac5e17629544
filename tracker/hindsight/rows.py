"""Rows of tracks, smoothed, those between detections included."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from tracker.hindsight.pieces import Pieces, Scans
from tracker.hindsight.smoothing import (
    Grid,
    Smoothable,
    filter_forward,
    smooth_backward,
    spread_out,
)
from tracker.hindsight.stabilise import CommonFrame
from tracker.log.model import DetectionLog, Floats, Ints, Kind
from tracker.results.recorder import TrackRows
from tracker.results.tracks import TrackState
from tracker.settings import Settings


def smoothed_rows(
    log: DetectionLog,
    pieces: Pieces,
    scans: Scans,
    common: CommonFrame,
    model: Smoothable,
    settings: Settings,
    z: Floats,
    variance: Floats,
) -> tuple[TrackRows, Ints]:
    """The rows of some pieces, by (scan, piece), and the engine's track of each, -1 for none.

    z, variance : (N, d) of the log in the common frame. A row between detections is 'coasting'
    and reported if its gap is short and its smoothed position well known.
    """
    d = model.dimension
    grid = spread_out(pieces)
    states = filter_forward(model, grid, scans, z, variance)
    smooth_backward(model, grid, scans, states)
    velocity = states.mean[:, d : 2 * d]
    if model.states < 2 * d:  # a model without rates
        velocity = np.zeros((len(grid), d))
    estimate, rate, covariance = common.back(
        states.mean[:, :d], velocity, states.covariance[:, :d, :d], grid.scan
    )
    seen = grid.detection >= 0
    known, gap = _around(grid, scans)
    reported = seen | (
        (gap <= settings.hindsight.fill_seconds)
        & _well_known(model, estimate, covariance, settings.hindsight.fill_spread)
    )
    if log.kind is Kind.BOX:
        reported &= (estimate[:, 2:4] > 0.0).all(axis=1) | seen
    shown = estimate.copy()
    position = settings.output.position
    if position == "detected" or (position == "auto" and log.kind is Kind.BOX):
        shown[seen] = log.z[grid.detection[seen]]
    source = grid.detection[known]  # the row's own detection or the last before it
    line = np.full(len(grid), -1, np.int64)
    line[seen] = log.line[grid.detection[seen]]
    upper, other = np.triu_indices(d)
    own = _detection_of_row(grid, pieces)
    online = np.where(seen, pieces.online[own], -1)
    rows = TrackRows(
        frame=scans.number[grid.scan],
        time=scans.time[grid.scan],
        track=pieces.identity[grid.piece],
        z=shown,
        estimate=estimate,
        rate=rate,
        covariance=covariance[:, upper, other],
        score=log.score[source],
        label=log.label[source],
        confidence=np.exp(pieces.log_confidence[own]),
        state=np.where(seen, TrackState.CONFIRMED, TrackState.COASTING).astype(np.int8),
        reported=reported,
        line=line,
    )
    return rows, online


def _detection_of_row(grid: Grid, pieces: Pieces) -> Ints:
    """(R,) number, among the pieces' detections, of each row's own or else the last before."""
    order = np.lexsort((grid.scan, grid.piece))  # the order of the pieces' detections
    number = np.empty(len(grid), np.int64)
    number[order] = np.cumsum(grid.detection[order] >= 0) - 1
    return number


def _around(grid: Grid, scans: Scans) -> tuple[Ints, Floats]:
    """For each row the row of its own detection or else the last before it, and the seconds from
    there to the next detection (0 where it has its own)."""
    order = np.lexsort((grid.scan, grid.piece))
    seen = grid.detection[order] >= 0
    place = np.arange(len(order))
    before = np.maximum.accumulate(np.where(seen, place, 0))
    after = np.minimum.accumulate(np.where(seen, place, len(order) - 1)[::-1])[::-1]
    time = scans.time[grid.scan[order]]
    last, gap = np.empty(len(order), np.int64), np.empty(len(order))
    last[order], gap[order] = order[before], time[after] - time[before]
    return last, gap


def _well_known(
    model: Smoothable, estimate: Floats, covariance: Floats, most: float
) -> NDArray[np.bool_]:
    """Whether positions are known to within so many standard deviations of a detection there."""
    variance = model.measurement_variance(estimate, None)
    spread = np.diagonal(covariance, axis1=1, axis2=2)
    near = spread[:, :2] <= most**2 * variance[:, :2]
    return near[:, 0] & near[:, 1]
