"""The pinhole camera against hand values and against opencv."""

from __future__ import annotations

import numpy as np
import pytest

from tracker.simulation.sensors.projection import (
    CameraSettings,
    Pose,
    bounding_boxes,
    cuboid,
    project,
)

CAMERA = CameraSettings(
    image_width=1280, image_height=720, focal_px=1000.0, mast_height_m=8.0, tilt_degrees=30.0
)


def _pose(pan=0.0, tilt=30.0, roll=0.0, zoom=1.0, rows=1) -> Pose:
    return Pose(*(np.full(rows, value) for value in (*np.radians([pan, tilt, roll]), zoom)))


def test_where_the_axis_meets_the_ground_is_the_middle_of_the_image():
    # By hand: tilt 30°, height 8 m: 8 / tan 30° = 13.8564 m away, at a depth of 8 / sin 30° = 16 m.
    image, depth = project(np.array([[[0.0, 13.856406, 0.0]]]), _pose(), CAMERA)
    assert image[0, 0] == pytest.approx([640.0, 360.0], abs=1e-4)
    assert depth[0, 0] == pytest.approx(16.0, abs=1e-5)
    # One metre to the right of it is 1000 / 16 = 62.5 px further right.
    image, _ = project(np.array([[[1.0, 13.856406, 0.0]]]), _pose(), CAMERA)
    assert image[0, 0] == pytest.approx([702.5, 360.0], abs=1e-4)


def test_the_horizon_is_where_the_tilt_puts_it():
    # Points far away tend to v = cy - f tan(tilt) (Hartley and Zisserman 2004, vanishing line).
    image, _ = project(np.array([[[0.0, 1e9, 0.0]]]), _pose(), CAMERA)
    assert image[0, 0, 1] == pytest.approx(360.0 - 1000.0 * np.tan(np.radians(30.0)), abs=1e-3)


@pytest.mark.parametrize("seed", range(5))
def test_projection_agrees_with_opencv(seed):
    cv2 = pytest.importorskip("cv2")
    rng = np.random.default_rng(seed)
    pan, tilt, roll = rng.uniform([-10, 10, -5], [10, 40, 5])
    zoom = rng.uniform(0.9, 1.1)
    points = rng.uniform([-10, 8, 0], [10, 40, 3], (50, 3))
    # opencv: x right, y down, z along the axis; our world has z up, so at rest R maps
    # (x, y, z) to (x, -z, y); then pan about the vertical, tilt, roll about the axis.
    a, b, c = np.radians([pan, tilt, roll])
    at_rest = np.array([[1, 0, 0], [0, 0, -1], [0, 1, 0]], float)
    turn = cv2.Rodrigues(np.array([0.0, 0.0, -c]))[0]
    turn = turn @ cv2.Rodrigues(np.array([b, 0.0, 0.0]))[0]
    turn = turn @ cv2.Rodrigues(np.array([0.0, -a, 0.0]))[0] @ at_rest
    matrix = np.array([[1000 * zoom, 0, 640], [0, 1000 * zoom, 360], [0, 0, 1.0]])
    shift = -turn @ np.array([0.0, 0.0, 8.0])
    expected, _ = cv2.projectPoints(points, cv2.Rodrigues(turn)[0], shift, matrix, None)
    found, _ = project(points[None], _pose(pan, tilt, roll, zoom), CAMERA)
    assert found[0] == pytest.approx(expected[:, 0], abs=1e-6)


def test_positive_angles_do_what_they_say():
    ahead = np.array([[[0.0, 20.0, 1.0]]])
    before, _ = project(ahead, _pose(), CAMERA)
    right, _ = project(ahead, _pose(pan=2.0), CAMERA)
    down, _ = project(ahead, _pose(tilt=32.0), CAMERA)
    assert right[0, 0, 0] < before[0, 0, 0]  # the camera turns right, things move left
    assert down[0, 0, 1] < before[0, 0, 1]  # the camera looks down, things move up
    aside = np.array([[[5.0, 13.856406, 0.0]]])
    level, _ = project(aside, _pose(), CAMERA)
    rolled, _ = project(aside, _pose(roll=2.0), CAMERA)
    assert rolled[0, 0, 1] < level[0, 0, 1]  # the picture turns counter-clockwise


def test_cuboids_stand_on_the_ground_and_turn_with_the_heading():
    corners = cuboid(np.array([[2.0, 3.0]]), np.array([np.pi / 2]), np.array([[4.0, 1.0, 2.0]]))
    assert corners[0].min(axis=0) == pytest.approx([1.5, 1.0, 0.0])
    assert corners[0].max(axis=0) == pytest.approx([2.5, 5.0, 2.0])
    raised = cuboid(np.zeros((1, 2)), np.zeros(1), np.ones((1, 3)), 5.0)
    assert raised[0, :, 2].min() == 5.0


def test_the_same_person_is_smaller_farther_away():
    size = np.tile([0.4, 0.55, 1.7], (2, 1))
    places = np.array([[0.0, 12.0], [0.0, 24.0]])
    boxes, depth = bounding_boxes(places, np.zeros(2), size, _pose(rows=2), CAMERA)
    assert boxes[0, 3] > 1.5 * boxes[1, 3]
    assert depth[0] < depth[1]
