"""A pinhole camera on a mast that looks down on the ground plane.

World: x to the right, y away from the mast, z up, metres; the camera is at (0, 0, mast height).
Image: pixels from the top left corner, x to the right and y down.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated

import numpy as np
from msgspec import Meta

from tracker.log.model import Floats
from tracker.settings.fields import Positive, about
from tracker.simulation.settings import Section

NEAREST_DEPTH_M = 1.0  # nothing nearer to the camera's plane is projected


class CameraSettings(Section, frozen=True):
    """Where the camera is and what it sees."""

    image_width: Annotated[int, Meta(ge=16, le=16_384), about("Width of the image", "px")] = 1280
    image_height: Annotated[int, Meta(ge=16, le=16_384), about("Height of the image", "px")] = 720
    focal_px: Annotated[float, Positive, about("Focal length", "px")] = 1000.0
    mast_height_m: Annotated[float, Positive, about("Height above the ground", "m")] = 8.0
    tilt_degrees: Annotated[
        float,
        Meta(gt=0.0, lt=90.0),
        about("Angle of the optical axis below the horizon", "degrees"),
    ] = 22.0


@dataclass(frozen=True, slots=True)
class Pose:
    """Camera angles and zoom, one value a row: (n,) radians, zoom as a factor of the focal length.

    Positive pan turns right, positive tilt looks further down, positive roll turns the camera
    clockwise (the picture turns counter-clockwise).
    """

    pan: Floats
    tilt: Floats
    roll: Floats
    zoom: Floats

    def rows(self, index: np.ndarray) -> Pose:
        return Pose(self.pan[index], self.tilt[index], self.roll[index], self.zoom[index])


def project(points: Floats, pose: Pose, camera: CameraSettings) -> tuple[Floats, Floats]:
    """Image (n, k, 2) in pixels and depth (n, k) in metres of world points (n, k, 3).

    Pinhole model: q = p - c; u = cx + f zoom (r . q) / (a . q), v = cy + f zoom (d . q) / (a . q)
    with the camera's right r, down d and optical axis a (Hartley and Zisserman 2004, ch. 6).
    """
    right, down, axis = (basis[:, None, :] for basis in _axes(pose))
    q = points - np.array([0.0, 0.0, camera.mast_height_m])
    depth = (q * axis).sum(axis=-1)
    focal = (camera.focal_px * pose.zoom)[:, None] / np.maximum(depth, NEAREST_DEPTH_M)
    u = 0.5 * camera.image_width + focal * (q * right).sum(axis=-1)
    v = 0.5 * camera.image_height + focal * (q * down).sum(axis=-1)
    return np.stack((u, v), axis=-1), depth


def _axes(pose: Pose) -> tuple[Floats, Floats, Floats]:
    """(n, 3) right, down and axis of the camera in the world."""
    zero = np.zeros_like(pose.pan)
    axis = np.stack(
        (
            np.sin(pose.pan) * np.cos(pose.tilt),
            np.cos(pose.pan) * np.cos(pose.tilt),
            -np.sin(pose.tilt),
        ),
        axis=-1,
    )
    level = np.stack((np.cos(pose.pan), -np.sin(pose.pan), zero), axis=-1)
    below = np.cross(axis, level)
    cos, sin = np.cos(pose.roll)[:, None], np.sin(pose.roll)[:, None]
    return cos * level + sin * below, cos * below - sin * level, axis


def cuboid(xy: Floats, heading: Floats, size: Floats, base: Floats | float = 0.0) -> Floats:
    """(n, 8, 3) corners of upright cuboids.

    xy : (n, 2) centre.   heading : (n,) radians from x towards y.
    size : (n, 3) length along the heading, width across it, height, metres.
    base : (n,) height of their lower side above the ground, metres.
    """
    along = np.stack((np.cos(heading), np.sin(heading)), axis=-1)
    across = np.stack((-along[:, 1], along[:, 0]), axis=-1)
    corners = np.empty((len(xy), 8, 3))
    for k, (a, b, top) in enumerate(
        (a, b, top) for a in (-0.5, 0.5) for b in (-0.5, 0.5) for top in (0.0, 1.0)
    ):
        corners[:, k, :2] = xy + a * size[:, :1] * along + b * size[:, 1:2] * across
        corners[:, k, 2] = base + top * size[:, 2]
    return corners


def bounding_boxes(
    xy: Floats,
    heading: Floats,
    size: Floats,
    pose: Pose,
    camera: CameraSettings,
    base: Floats | float = 0.0,
) -> tuple[Floats, Floats]:
    """Boxes (n, 4) left, top, width, height around cuboids, and (n,) depths of the nearest corners.

    Parameters are those of `cuboid` and `project`.
    """
    image, depth = project(cuboid(xy, heading, size, base), pose, camera)
    low, high = image.min(axis=1), image.max(axis=1)
    return np.concatenate((low, high - low), axis=1), depth.min(axis=1)
