"""Tracks and detections of a frame, described."""

from __future__ import annotations

import math

import numpy as np

from tracker.diagnosis.explanation import DetectionView, TrackView
from tracker.diagnosis.history import afterwards
from tracker.diagnosis.inquiry import Inquiry


def track_views(inquiry: Inquiry, tracks: set[int]) -> tuple[TrackView, ...]:
    """Describe some tracks, in order of id."""
    number = inquiry.record.number
    own = inquiry.ledger.own_tracks
    rows = inquiry.ledger.rows(
        own, number, number, columns=("track", "confidence", "label")
    ).to_pylist()
    shown = {row["track"]: row for row in rows if row["track"] in tracks}
    return tuple(_track(inquiry, track, shown.get(track, {})) for track in sorted(tracks))


def _track(inquiry: Inquiry, track: int, shown: dict) -> TrackView:
    record, names = inquiry.record, inquiry.ledger.coordinates
    life = inquiry.life(track)
    row = record.row_of(track)
    position: dict[str, float] = {}
    sigma: dict[str, float] = {}
    covariance: tuple[float, ...] = ()
    if row is not None:
        spread = np.sqrt(np.diagonal(record.covariance[row]))
        position = dict(zip(names, record.estimate[row].tolist(), strict=True))
        sigma = dict(zip(names, spread.tolist(), strict=True))
        covariance = tuple(record.covariance[row][np.triu_indices(len(names))].tolist())
    decided = inquiry.rows_of(track=track)
    margin = float(record.decisions.margin[decided[-1]]) if len(decided) else math.inf
    births = {born: detection for detection, born in record.born.items()}
    return TrackView(
        track=track,
        state=None if row is None else record.state[row],
        state_after=life.state_after(record.number),
        unseen_seconds=None if row is None else float(record.unseen[row]),
        position=position,
        sigma=sigma,
        covariance=covariance,
        detection=births.get(track) if row is None else record.given(track),
        margin=margin if math.isfinite(margin) else None,
        confidence=shown.get("confidence"),
        label=shown.get("label"),
        born_frame=life.born,
        confirmed_frame=life.confirmed,
        ended_frame=life.ended,
        afterwards=afterwards(life, record.number),
    )


def detection_views(inquiry: Inquiry, detections: set[int]) -> tuple[DetectionView, ...]:
    """Describe some detections, in order of their number in the frame."""
    record, names = inquiry.record, inquiry.ledger.coordinates
    views = []
    for j in sorted(detections):
        score = float(record.score[j])
        given = record.given_to(j)
        views.append(
            DetectionView(
                detection=j,
                line=record.line_of(j),
                score=None if math.isnan(score) else score,
                label=record.label[j],
                position=dict(zip(names, record.z[j].tolist(), strict=True)),
                sigma=dict(zip(names, np.sqrt(record.variance[j]).tolist(), strict=True)),
                track=record.born.get(j) if given is None else given,
                starts_track=given is None and j in record.born,
            )
        )
    return tuple(views)
