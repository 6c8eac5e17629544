"""A sensor that looks straight down on the field of the `scale` scene: nothing hides anything."""

from __future__ import annotations

import numpy as np

from tracker.log.model import Floats, Kind, SequenceFacts, box_corner
from tracker.simulation.layout import detection_columns, truth_columns
from tracker.simulation.sensors.clutter import clutter_frames
from tracker.simulation.sensors.delivery import Frames, deliver
from tracker.simulation.sensors.detector import detection_probability
from tracker.simulation.sensors.sensing import Clutter, sense
from tracker.simulation.sequence import Detections, SimulatedSequence, TrueObjects
from tracker.simulation.settings import (
    ClockSettings,
    DetectionSettings,
    NoiseSettings,
    SceneSettings,
)
from tracker.simulation.streams import Streams
from tracker.simulation.tables import rounded
from tracker.simulation.world.drift import DriftSettings, drift
from tracker.simulation.world.movement import Movement

SENSOR = "field"
LABELS = ("object",)
DECIMALS = 2
SMALLEST = 0.5


class ScaleSettings(SceneSettings, frozen=True):
    """Objects at constant density, in full view."""

    clock: ClockSettings = ClockSettings(seconds=4.0, frame_rate_hz=25.0)
    detection: DetectionSettings = DetectionSettings(probability=0.95, size_half=0.0)
    noise: NoiseSettings = NoiseSettings()
    drift: DriftSettings = DriftSettings()


def watch_field(scene: str, settings: ScaleSettings, streams: Streams) -> SimulatedSequence:
    """Simulate the field. Points have the position noise of a box of the mean size."""
    frames = deliver(settings.clock, settings.delivery, streams)
    movement, number = drift(settings.drift, frames.time, streams).numbered()
    kind = Kind(settings.drift.kind)
    exact, sigma = _measurement(movement, kind, settings)
    true = TrueObjects(
        frame=movement.frame,
        object=number,
        values=rounded(box_corner(exact) if kind is Kind.BOX else exact, DECIMALS),
        label=movement.label[movement.object],
        visibility=np.ones(len(movement)),
        probability=detection_probability(
            np.ones(len(movement)),
            movement.size[movement.object][:, 1],
            settings.detection,
        ),
        xy=movement.xy,
        velocity=movement.velocity,
    )
    sensed = sense(
        true,
        exact,
        sigma,
        _clutter(settings, frames, kind, streams),
        settings,
        frames,
        len(LABELS),
        streams,
        correlation_seconds=settings.noise.correlation_seconds,
    )
    measured = sensed.measured.copy()
    measured[:, 2:] = np.maximum(measured[:, 2:], SMALLEST)
    found = Detections(
        frame=sensed.frame,
        values=rounded(box_corner(measured) if kind is Kind.BOX else measured, DECIMALS),
        score=sensed.score,
        label=sensed.label,
        origin=sensed.origin,
        embedding=sensed.embedding,
    )
    return SimulatedSequence(
        scene=scene,
        seed=streams.seed,
        settings=settings,
        kind=kind,
        facts=SequenceFacts(
            name=scene,
            frame_rate_hz=settings.clock.frame_rate_hz,
            frames=frames.scheduled,
            image_width=float(np.ceil(settings.drift.side)),
            image_height=float(np.ceil(settings.drift.side)),
            sensor=SENSOR,
        ),
        frames=frames,
        labels=LABELS,
        detections=found,
        objects=true,
        tables={
            "detections.csv": detection_columns(kind, found, frames, LABELS),
            "truth.csv": truth_columns(kind, true, frames, LABELS),
        },
    )


def _measurement(movement: Movement, kind: Kind, settings: ScaleSettings) -> tuple[Floats, Floats]:
    """Exact measurements (n, d) in filter order, and the standard deviations of their noise."""
    noise = settings.noise
    if kind is Kind.POINT:
        sigma = noise.position_sigma * settings.drift.size
        return movement.xy, np.full(movement.xy.shape, sigma)
    size = movement.size[movement.object][:, :2]
    scale = np.sqrt(size[:, :1] * size[:, 1:])
    each = (noise.position_sigma, noise.position_sigma, noise.size_sigma, noise.size_sigma)
    return np.concatenate((movement.xy, size), axis=1), scale * np.array(each)


def _clutter(settings: ScaleSettings, frames: Frames, kind: Kind, streams: Streams) -> Clutter:
    """Uniform over the field, boxes in the sizes of the objects."""
    field = settings.drift
    frame = clutter_frames(field.clutter_per_object * field.objects, len(frames), streams)
    measured = streams("clutter places").random((len(frame), 2)) * field.side
    if kind is Kind.BOX:
        normals = streams("clutter sizes").standard_normal((len(frame), 2))
        size = field.size * np.exp(field.size_spread * normals)
        measured = np.concatenate((measured, size), axis=1)
    return Clutter(frame, measured, np.zeros(len(frame), np.int32))
