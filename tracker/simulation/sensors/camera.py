"""The mast camera's view of the forecourt: bodies on the ground plane become boxes."""

from __future__ import annotations

from typing import Annotated

import numpy as np

from tracker.errors import UsageError
from tracker.log.model import Floats, Kind, SequenceFacts, box_centre, box_corner
from tracker.settings.fields import about
from tracker.simulation.layout import detection_columns, truth_columns
from tracker.simulation.sensors.clutter import (
    ClutterSettings,
    clutter_boxes,
    clutter_frames,
    clutter_labels,
)
from tracker.simulation.sensors.delivery import Frames, deliver
from tracker.simulation.sensors.detector import detection_probability
from tracker.simulation.sensors.obstacles import obstacle_boxes
from tracker.simulation.sensors.projection import (
    NEAREST_DEPTH_M,
    CameraSettings,
    Pose,
    bounding_boxes,
)
from tracker.simulation.sensors.sensing import Clutter, Sensed, sense
from tracker.simulation.sensors.sway import SwaySettings, camera_pose
from tracker.simulation.sensors.visibility import visible_share
from tracker.simulation.sequence import Detections, SimulatedSequence, TrueObjects
from tracker.simulation.settings import NoiseSettings, SceneSettings, Section, Share
from tracker.simulation.streams import Streams
from tracker.simulation.tables import SHARE_DECIMALS, Columns, rounded
from tracker.simulation.world.movement import Movement
from tracker.simulation.world.parties import LABELS
from tracker.simulation.world.site import SiteSettings, TrafficSettings
from tracker.simulation.world.walkers import walk

SENSOR = "mast camera"
DECIMALS = 2
SMALLEST_PX = 0.5  # noise cannot make a box smaller


class ViewSettings(Section, frozen=True):
    """What counts as in view, and what hides what."""

    least_inside: Annotated[
        float, Share, about("Objects with less of their box inside the image are not in view")
    ] = 0.3
    body_fill: Annotated[
        float,
        Share,
        about("Share of its box's width that a body really covers, when it hides others"),
    ] = 0.8


class CameraSceneSettings(SceneSettings, frozen=True):
    """A scene filmed by the mast camera."""

    traffic: TrafficSettings = TrafficSettings()
    camera: CameraSettings = CameraSettings()
    sway: SwaySettings = SwaySettings()
    view: ViewSettings = ViewSettings()
    noise: NoiseSettings = NoiseSettings()
    clutter: ClutterSettings = ClutterSettings()
    site: SiteSettings = SiteSettings()


def film(scene: str, settings: CameraSceneSettings, streams: Streams) -> SimulatedSequence:
    """Simulate the forecourt and what the camera's detector makes of it.

    Raises UsageError if no frame would have a detection and an object in it.
    """
    frames = deliver(settings.clock, settings.delivery, streams)
    movement = walk(settings.site, settings.traffic, frames.time, streams)
    pose = camera_pose(settings.camera, settings.sway, frames.time, streams)
    true, exact = _in_view(movement, pose, settings)
    found = _detections(true, exact, frames, settings, streams)
    if not len(found) or not len(true):
        raise UsageError("nobody would be seen: lengthen the sequence or raise the traffic")
    tables: dict[str, Columns] = {
        "detections.csv": detection_columns(Kind.BOX, found, frames, LABELS),
        "truth.csv": truth_columns(Kind.BOX, true, frames, LABELS),
    }
    if settings.sway.moves:
        tables["camera.csv"] = _pose_columns(pose, frames)
    return SimulatedSequence(
        scene=scene,
        seed=streams.seed,
        settings=settings,
        kind=Kind.BOX,
        facts=SequenceFacts(
            name=scene,
            frame_rate_hz=settings.clock.frame_rate_hz,
            frames=frames.scheduled,
            image_width=float(settings.camera.image_width),
            image_height=float(settings.camera.image_height),
            sensor=SENSOR,
        ),
        frames=frames,
        labels=LABELS,
        detections=found,
        objects=true,
        tables=tables,
        pose=pose,
    )


def _in_view(
    movement: Movement, pose: Pose, settings: CameraSceneSettings
) -> tuple[TrueObjects, Floats]:
    """Objects in the image, and their exact boxes (n, 4) as centre, width, height."""
    camera, view = settings.camera, settings.view
    boxes, depth = _project(movement, pose, camera)
    bounds = (0.0, 0.0, float(camera.image_width), float(camera.image_height))
    seen = (depth > NEAREST_DEPTH_M) & (_inside(boxes, bounds) >= view.least_inside)
    movement, number = movement.select(seen).numbered()
    boxes, depth = _project(movement, pose, camera)
    visibility = rounded(
        _visibility(movement, boxes, depth, pose, settings, bounds), SHARE_DECIMALS
    )
    values = rounded(boxes, DECIMALS)
    values[:, 2:] = np.maximum(values[:, 2:], SMALLEST_PX)
    true = TrueObjects(
        frame=movement.frame,
        object=number,
        values=values,
        label=movement.label[movement.object],
        visibility=visibility,
        probability=detection_probability(visibility, boxes[:, 3], settings.detection),
        xy=movement.xy,
        velocity=movement.velocity,
    )
    return true, box_centre(boxes)


def _project(movement: Movement, pose: Pose, camera: CameraSettings) -> tuple[Floats, Floats]:
    size = movement.size[movement.object]
    return bounding_boxes(movement.xy, movement.heading, size, pose.rows(movement.frame), camera)


def _inside(boxes: Floats, bounds: tuple[float, float, float, float]) -> Floats:
    """(n,) share of each box's area within the image."""
    low, high = boxes[:, :2], boxes[:, :2] + boxes[:, 2:]
    overlap = np.minimum(high, bounds[2:]) - np.maximum(low, bounds[:2])
    return np.maximum(overlap, 0.0).prod(axis=1) / boxes[:, 2:].prod(axis=1)


def _visibility(
    movement: Movement,
    boxes: Floats,
    depth: Floats,
    pose: Pose,
    settings: CameraSceneSettings,
    bounds: tuple[float, float, float, float],
) -> Floats:
    """(n,) visible share among people and the site's obstacles."""
    frame, everything, distance = movement.frame, boxes, depth
    slim = boxes.copy()
    slim[:, 0] += 0.5 * (1.0 - settings.view.body_fill) * boxes[:, 2]
    slim[:, 2] *= settings.view.body_fill
    fixed, far = obstacle_boxes(settings.site, pose, settings.camera)
    frame = np.concatenate((frame, np.repeat(np.arange(len(fixed)), fixed.shape[1])))
    everything = np.concatenate((everything, fixed.reshape(-1, 4)))
    slim = np.concatenate((slim, fixed.reshape(-1, 4)))
    distance = np.concatenate((distance, far.ravel()))
    order = np.argsort(frame, kind="stable")
    share = np.empty(len(frame))
    share[order] = visible_share(
        frame[order], everything[order], distance[order], blockers=slim[order], bounds=bounds
    )
    return share[: len(movement)]


def _detections(
    true: TrueObjects,
    exact: Floats,
    frames: Frames,
    settings: CameraSceneSettings,
    streams: Streams,
) -> Detections:
    noise, camera = settings.noise, settings.camera
    scale = np.sqrt(exact[:, 2:3] * exact[:, 3:4])
    grown = 1.0 + noise.occlusion_factor * (1.0 - true.visibility[:, None])
    each = (noise.position_sigma, noise.position_sigma, noise.size_sigma, noise.size_sigma)
    frame = clutter_frames(settings.clutter.per_frame, len(frames), streams)
    false = clutter_boxes(
        settings.clutter, len(frame), camera.image_width, camera.image_height, streams
    )
    clutter = Clutter(frame, box_centre(false), clutter_labels(len(frame), len(LABELS), streams))
    sensed: Sensed = sense(
        true,
        exact,
        scale * grown * np.array(each),
        clutter,
        settings,
        frames,
        len(LABELS),
        streams,
        correlation_seconds=noise.correlation_seconds,
    )
    measured = sensed.measured.copy()
    measured[:, 2:] = np.maximum(measured[:, 2:], SMALLEST_PX)
    return Detections(
        frame=sensed.frame,
        values=rounded(box_corner(measured), DECIMALS),
        score=sensed.score,
        label=sensed.label,
        origin=sensed.origin,
        embedding=sensed.embedding,
    )


def _pose_columns(pose: Pose, frames: Frames) -> Columns:
    """camera.csv: where the camera really looked."""
    degrees = 180.0 / np.pi
    return {
        "frame": frames.number,
        "time": frames.time,
        "pan_degrees": rounded(pose.pan * degrees, 5),
        "tilt_degrees": rounded(pose.tilt * degrees, 5),
        "roll_degrees": rounded(pose.roll * degrees, 5),
        "zoom": rounded(pose.zoom, 6),
    }
