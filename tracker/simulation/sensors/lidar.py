"""The roof lidar's view of the yard: vehicles as oriented boxes on the ground."""

from __future__ import annotations

from typing import Annotated

import numpy as np
from msgspec import Meta

from tracker.errors import UsageError
from tracker.log.model import Floats, Kind, SequenceFacts
from tracker.settings.fields import NonNegative, Positive, about
from tracker.simulation.layout import detection_columns, truth_columns
from tracker.simulation.sensors.clutter import clutter_frames, clutter_labels
from tracker.simulation.sensors.delivery import Frames, deliver
from tracker.simulation.sensors.detector import detection_probability
from tracker.simulation.sensors.projection import cuboid
from tracker.simulation.sensors.sensing import Clutter, sense
from tracker.simulation.sensors.visibility import visible_share
from tracker.simulation.sequence import Detections, SimulatedSequence, TrueObjects
from tracker.simulation.settings import (
    ClockSettings,
    DetectionSettings,
    SceneSettings,
    Section,
    Share,
)
from tracker.simulation.streams import Streams
from tracker.simulation.tables import SHARE_DECIMALS, Columns, named, rounded
from tracker.simulation.world.movement import Movement
from tracker.simulation.world.vehicles import LABELS, FleetSettings, drive

SENSOR = "roof lidar"
DECIMALS = 3
SMALLEST_M = 0.1
SHAPE = ("length", "width", "heading")


class LidarSettings(Section, frozen=True):
    """Where the lidar is and how well it measures."""

    x_m: Annotated[float, about("Place in the yard's x", "m")] = 40.0
    y_m: Annotated[
        float, Meta(lt=0.0), about("Place in the yard's y: south of the yard", "m")
    ] = -8.0
    height_m: Annotated[float, Positive, about("Height above the ground", "m")] = 14.0
    position_sigma_m: Annotated[
        float, Positive, about("Standard deviation of the centre in x and in y", "m")
    ] = 0.18
    size_sigma_m: Annotated[
        float, NonNegative, about("Standard deviation of length and width", "m")
    ] = 0.15
    heading_sigma_degrees: Annotated[
        float, NonNegative, about("Standard deviation of the heading", "degrees")
    ] = 3.0
    heading_flip_probability: Annotated[
        float, Share, about("Chance that front and back are mistaken for each other")
    ] = 0.02
    clutter_per_frame: Annotated[
        float, NonNegative, about("Mean number of false detections a frame (Poisson)", "detections")
    ] = 0.6


class YardSettings(SceneSettings, frozen=True):
    """The loading yard under the roof lidar."""

    clock: ClockSettings = ClockSettings(seconds=30.0, frame_rate_hz=10.0)
    detection: DetectionSettings = DetectionSettings(probability=0.96, size_half=0.9)
    fleet: FleetSettings = FleetSettings()
    lidar: LidarSettings = LidarSettings()


def scan_yard(scene: str, settings: YardSettings, streams: Streams) -> SimulatedSequence:
    """Simulate the yard and what the lidar's detector makes of it.

    Raises UsageError if no vehicle would be detected.
    """
    frames = deliver(settings.clock, settings.delivery, streams)
    movement, number = drive(settings.fleet, frames.time, streams).numbered()
    visibility = rounded(_visibility(movement, settings.lidar), SHARE_DECIMALS)
    exact = np.column_stack(
        (movement.xy, movement.size[movement.object][:, :2], _wrapped(movement.heading))
    )
    shape = rounded(exact[:, 2:], DECIMALS)
    true = TrueObjects(
        frame=movement.frame,
        object=number,
        values=rounded(movement.xy, DECIMALS),
        label=movement.label[movement.object],
        visibility=visibility,
        probability=detection_probability(
            visibility, _apparent_width(movement, settings.lidar), settings.detection
        ),
        xy=movement.xy,
        velocity=movement.velocity,
        shape=shape,
    )
    found, found_shape = _detections(true, exact, frames, settings, streams)
    if not len(found) or not len(true):
        raise UsageError("no vehicle would be seen: lengthen the sequence or raise the traffic")
    plain = detection_columns(Kind.POINT, found, frames, LABELS)
    return SimulatedSequence(
        scene=scene,
        seed=streams.seed,
        settings=settings,
        kind=Kind.POINT,
        facts=SequenceFacts(
            name=scene,
            frame_rate_hz=settings.clock.frame_rate_hz,
            frames=frames.scheduled,
            sensor=SENSOR,
        ),
        frames=frames,
        labels=LABELS,
        detections=found,
        objects=true,
        tables={
            "detections.csv": plain,
            "detections_oriented.csv": _oriented(plain, found_shape),
            "truth.csv": truth_columns(Kind.POINT, true, frames, LABELS),
            "truth_oriented.csv": _oriented(truth_columns(Kind.POINT, true, frames, LABELS), shape),
        },
        notes={
            "units": "x, y, length, width in metres; heading in radians from x towards y, "
            "-pi to pi; detections.csv and truth.csv are the centres of the oriented boxes"
        },
    )


def _oriented(plain: Columns, shape: Floats) -> Columns:
    """The columns with length, width and heading after y; the centre's sigmas are left out."""
    columns: Columns = {}
    for name, column in plain.items():
        if not name.startswith("sigma_"):
            columns[name] = column
        if name == "y":
            columns |= named(SHAPE, shape)
    return columns


def _visibility(movement: Movement, lidar: LidarSettings) -> Floats:
    """(n,) visible share: each vehicle is a box of bearings and elevations, nearer ones hide it."""
    corners = cuboid(movement.xy, movement.heading, movement.size[movement.object])
    corners = corners - np.array([lidar.x_m, lidar.y_m, lidar.height_m])
    reach = np.sqrt((corners[..., :2] ** 2).sum(axis=-1))
    # Everything is north of the lidar: bearings from north do not wrap.
    bearing = np.arctan2(corners[..., 0], corners[..., 1])
    elevation = np.arctan2(corners[..., 2], reach)
    seen = np.stack((bearing, -elevation), axis=-1)
    low, high = seen.min(axis=1), seen.max(axis=1)
    return visible_share(
        movement.frame, np.concatenate((low, high - low), axis=1), reach.min(axis=1)
    )


def _apparent_width(movement: Movement, lidar: LidarSettings) -> Floats:
    """(n,) degrees that the footprint's mean extent fills at its distance."""
    size = movement.size[movement.object]
    reach = np.sqrt(((movement.xy - np.array([lidar.x_m, lidar.y_m])) ** 2).sum(axis=1))
    return np.degrees(np.arctan2(0.5 * (size[:, 0] + size[:, 1]), reach))


def _detections(
    true: TrueObjects, exact: Floats, frames: Frames, settings: YardSettings, streams: Streams
) -> tuple[Detections, Floats]:
    """Detections as points, and (n, 3) length, width and heading of each."""
    lidar = settings.lidar
    sigma = np.array(
        [
            lidar.position_sigma_m,
            lidar.position_sigma_m,
            lidar.size_sigma_m,
            lidar.size_sigma_m,
            np.radians(lidar.heading_sigma_degrees),
        ]
    )
    flipped = streams("flips").random(len(true)) < lidar.heading_flip_probability
    seen = exact + np.pi * flipped[:, None] * np.array([0.0, 0.0, 0.0, 0.0, 1.0])
    sensed = sense(
        true,
        seen,
        np.broadcast_to(sigma, seen.shape),
        _clutter(settings, frames, streams),
        settings,
        frames,
        len(LABELS),
        streams,
    )
    measured = sensed.measured.copy()
    measured[:, 2:4] = np.maximum(measured[:, 2:4], SMALLEST_M)
    measured[:, 4] = _wrapped(measured[:, 4])
    found = Detections(
        frame=sensed.frame,
        values=rounded(measured[:, :2], DECIMALS),
        score=sensed.score,
        label=sensed.label,
        origin=sensed.origin,
        sigma=np.full((len(measured), 2), lidar.position_sigma_m),
        embedding=sensed.embedding,
    )
    return found, rounded(measured[:, 2:], DECIMALS)


def _clutter(settings: YardSettings, frames: Frames, streams: Streams) -> Clutter:
    """Uniform over the yard, in sizes between a pallet and a small truck."""
    frame = clutter_frames(settings.lidar.clutter_per_frame, len(frames), streams)
    draws = streams("clutter places").random((len(frame), 5))
    low = np.array([0.0, 0.0, 1.0, 0.8, -np.pi])
    high = np.array([settings.fleet.yard_length_m, settings.fleet.yard_width_m, 5.0, 2.5, np.pi])
    return Clutter(
        frame, low + (high - low) * draws, clutter_labels(len(frame), len(LABELS), streams)
    )


def _wrapped(angle: Floats) -> Floats:
    """The same angles between -pi and pi."""
    return np.arctan2(np.sin(angle), np.cos(angle))
