"""Which columns the files of a sequence have."""

from __future__ import annotations

from tracker.log.model import Kind
from tracker.simulation.sensors.delivery import Frames
from tracker.simulation.sequence import Detections, TrueObjects
from tracker.simulation.tables import Columns, Words, named


def detection_columns(
    kind: Kind, found: Detections, frames: Frames, labels: tuple[str, ...]
) -> Columns:
    """detections.csv: frame, time, measurement, sigmas, score, label and what else there is."""
    columns: Columns = {"frame": frames.number[found.frame], "time": frames.time[found.frame]}
    if frames.arrival is not None:
        columns["arrival"] = frames.arrival[found.frame]
    columns |= named(kind.columns, found.values)
    if found.sigma is not None:
        columns |= named(kind.sigma_columns, found.sigma)
    columns |= found.extra
    columns |= {"score": found.score, "label": Words(found.label, labels)}
    if found.embedding is not None:
        names = tuple(f"embedding_{k}" for k in range(found.embedding.shape[1]))
        columns |= named(names, found.embedding)
    return columns


def truth_columns(
    kind: Kind, true: TrueObjects, frames: Frames, labels: tuple[str, ...]
) -> Columns:
    """truth.csv: frame, time, object, measurement, label, visibility."""
    return {
        "frame": frames.number[true.frame],
        "time": frames.time[true.frame],
        "object": true.object,
        **named(kind.columns, true.values),
        "label": Words(true.label, labels),
        "visibility": true.visibility,
    }
