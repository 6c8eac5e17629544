"""The site's fixed obstacles as the camera sees them."""

from __future__ import annotations

import numpy as np

from tracker.log.model import Floats
from tracker.simulation.sensors.projection import CameraSettings, Pose, bounding_boxes
from tracker.simulation.world.site import SiteSettings

SLICE_M = 1.0  # a tall thing leans in the picture: a stack of low boxes follows it


def obstacle_boxes(site: SiteSettings, pose: Pose, camera: CameraSettings) -> tuple[Floats, Floats]:
    """Boxes (poses, k, 4) left, top, width, height of all slices, and their depths (poses, k)."""
    poses = len(pose.pan)
    boxes, depths = [], []
    for item in site.obstacles:
        slices = max(round(item.height_m / SLICE_M), 1)
        height = item.height_m / slices
        xy = np.tile((item.x_m, item.y_m), (poses, 1))
        size = np.tile((item.width_m, item.depth_m, height), (poses, 1))
        for k in range(slices):
            box, depth = bounding_boxes(xy, np.zeros(poses), size, pose, camera, k * height)
            boxes.append(box)
            depths.append(depth)
    if not boxes:
        return np.empty((poses, 0, 4)), np.empty((poses, 0))
    return np.stack(boxes, axis=1), np.stack(depths, axis=1)
