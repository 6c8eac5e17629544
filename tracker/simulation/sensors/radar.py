"""The harbour radar: range, azimuth and range rate, and the same converted to x and y."""

from __future__ import annotations

from typing import Annotated

import numpy as np
from msgspec import Meta

from tracker.errors import UsageError
from tracker.log.model import Floats, Kind, SequenceFacts
from tracker.settings.fields import NonNegative, Positive, about
from tracker.simulation.layout import detection_columns, truth_columns
from tracker.simulation.sensors.clutter import clutter_frames, clutter_labels
from tracker.simulation.sensors.conversion import debiased
from tracker.simulation.sensors.delivery import Frames, deliver
from tracker.simulation.sensors.detector import detection_probability
from tracker.simulation.sensors.sensing import Clutter, Sensed, sense
from tracker.simulation.sequence import Detections, SimulatedSequence, TrueObjects
from tracker.simulation.settings import (
    ClockSettings,
    DetectionSettings,
    LabelSettings,
    SceneSettings,
    Section,
)
from tracker.simulation.streams import Streams
from tracker.simulation.tables import Columns, Words, named, rounded
from tracker.simulation.world.boats import LABELS, ApproachSettings, sail
from tracker.simulation.world.movement import Movement

SENSOR = "harbour radar"
POLAR = ("range", "azimuth", "range_rate")
POLAR_DECIMALS = (2, 6, 3)
POSITION_DECIMALS, SIGMA_DECIMALS = 2, 4


class RadarSettings(Section, frozen=True):
    """The radar at the origin, on the quay, looking along x."""

    nearest_m: Annotated[float, Positive, about("Shortest range", "m")] = 80.0
    farthest_m: Annotated[float, Positive, about("Longest range", "m")] = 4000.0
    half_sector_degrees: Annotated[
        float, Meta(gt=0.0, le=90.0), about("The radar sees this far to both sides of x", "degrees")
    ] = 65.0
    range_sigma_m: Annotated[float, Positive, about("Standard deviation of the range", "m")] = 6.0
    azimuth_sigma_degrees: Annotated[
        float, Positive, about("Standard deviation of the azimuth", "degrees")
    ] = 0.35
    range_rate_sigma: Annotated[
        float, Positive, about("Standard deviation of the range rate", "m/s")
    ] = 0.4
    clutter_per_scan: Annotated[
        float,
        NonNegative,
        about(
            "Mean number of sea clutter detections a scan (Poisson), uniform in range and azimuth"
        ),
    ] = 8.0
    clutter_range_rate_sigma: Annotated[
        float, NonNegative, about("Standard deviation of the sea clutter's range rate", "m/s")
    ] = 1.2


class HarbourSettings(SceneSettings, frozen=True):
    """Boats in the approach under the harbour radar."""

    clock: ClockSettings = ClockSettings(seconds=240.0, frame_rate_hz=0.5)
    detection: DetectionSettings = DetectionSettings(probability=0.95, size_half=0.1)
    labels: LabelSettings = LabelSettings(error_probability=0.1)
    approach: ApproachSettings = ApproachSettings()
    radar: RadarSettings = RadarSettings()


def scan_harbour(scene: str, settings: HarbourSettings, streams: Streams) -> SimulatedSequence:
    """Simulate the approach and what the radar makes of it.

    Raises UsageError if the radar would see no boat or nothing at all.
    """
    radar = settings.radar
    if radar.nearest_m >= radar.farthest_m:
        raise UsageError("radar.nearest_m must be less than radar.farthest_m")
    frames = deliver(settings.clock, settings.delivery, streams)
    movement = sail(settings.approach, frames.time, streams)
    exact = _polar(movement)
    inside = (exact[:, 0] >= radar.nearest_m) & (exact[:, 0] <= radar.farthest_m)
    inside &= np.abs(exact[:, 1]) <= np.radians(radar.half_sector_degrees)
    movement, number = movement.select(inside).numbered()
    exact = _polar(movement)
    visibility = np.ones(len(movement))
    length = movement.size[movement.object][:, 0]
    true = TrueObjects(
        frame=movement.frame,
        object=number,
        values=rounded(movement.xy, POSITION_DECIMALS),
        label=movement.label[movement.object],
        visibility=visibility,
        probability=detection_probability(
            visibility, np.degrees(length / np.maximum(exact[:, 0], 1.0)), settings.detection
        ),
        xy=movement.xy,
        velocity=movement.velocity,
    )
    sigma = np.array(
        [radar.range_sigma_m, np.radians(radar.azimuth_sigma_degrees), radar.range_rate_sigma]
    )
    sensed = sense(
        true,
        exact,
        np.broadcast_to(sigma, exact.shape),
        _sea_clutter(radar, frames, streams),
        settings,
        frames,
        len(LABELS),
        streams,
    )
    if not len(sensed.frame) or not len(true):
        raise UsageError("no boat would be seen: lengthen the sequence or raise the traffic")
    polar = np.stack([rounded(sensed.measured[:, k], POLAR_DECIMALS[k]) for k in range(3)], axis=1)
    found = _converted(sensed, polar, sigma)
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
            "detections.csv": detection_columns(Kind.POINT, found, frames, LABELS),
            "detections_polar.csv": _polar_columns(found, polar, sigma, frames),
            "truth.csv": truth_columns(Kind.POINT, true, frames, LABELS),
        },
        notes={
            "units": "x, y, range in metres; azimuth in radians from x towards y; range_rate in "
            "m/s, positive away from the radar, which is at (0, 0)",
            "conversion": "detections.csv is detections_polar.csv row by row, converted without "
            "bias (Lerro and Bar-Shalom 1993); covariance_xy goes with sigma_x and sigma_y",
        },
    )


def _polar(movement: Movement) -> Floats:
    """(n, 3) exact range, azimuth and range rate."""
    x, y = movement.xy.T
    reach = np.sqrt(x * x + y * y)
    rate = (movement.xy * movement.velocity).sum(axis=1) / np.maximum(reach, 1e-9)
    return np.stack((reach, np.arctan2(y, x), rate), axis=1)


def _sea_clutter(radar: RadarSettings, frames: Frames, streams: Streams) -> Clutter:
    frame = clutter_frames(radar.clutter_per_scan, len(frames), streams)
    draws = streams("clutter places").random((len(frame), 2))
    rate = radar.clutter_range_rate_sigma * streams("clutter rates").standard_normal(len(frame))
    reach = radar.nearest_m + (radar.farthest_m - radar.nearest_m) * draws[:, 0]
    azimuth = np.radians(radar.half_sector_degrees) * (2.0 * draws[:, 1] - 1.0)
    return Clutter(
        frame,
        np.stack((reach, azimuth, rate), axis=1),
        clutter_labels(len(frame), len(LABELS), streams),
    )


def _converted(sensed: Sensed, polar: Floats, sigma: Floats) -> Detections:
    """Converted from the rounded polar values, so that the two files agree row by row."""
    xy, covariance = debiased(polar[:, 0], polar[:, 1], sigma[0], sigma[1])
    return Detections(
        frame=sensed.frame,
        values=rounded(xy, POSITION_DECIMALS),
        score=sensed.score,
        label=sensed.label,
        origin=sensed.origin,
        sigma=rounded(np.sqrt(covariance[:, :2]), SIGMA_DECIMALS),
        embedding=sensed.embedding,
        extra={"covariance_xy": rounded(covariance[:, 2], SIGMA_DECIMALS)},
    )


def _polar_columns(found: Detections, polar: Floats, sigma: Floats, frames: Frames) -> Columns:
    columns: Columns = {"frame": frames.number[found.frame], "time": frames.time[found.frame]}
    if frames.arrival is not None:
        columns["arrival"] = frames.arrival[found.frame]
    each = np.tile([round(float(sigma[k]), 6) for k in range(3)], (len(polar), 1))
    columns |= named(POLAR, polar)
    columns |= named(tuple(f"sigma_{name}" for name in POLAR), each)
    return columns | {"score": found.score, "label": Words(found.label, LABELS)}
