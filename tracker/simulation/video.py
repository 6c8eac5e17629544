"""A plain picture of what the sensor looked at: for people, and as input for later tools."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path
from typing import Any, cast

import numpy as np
from numpy.typing import NDArray

from tracker.errors import OutputError, UsageError
from tracker.log.model import Floats, Kind
from tracker.results.folder import atomic_file
from tracker.simulation.sensors.camera import CameraSceneSettings
from tracker.simulation.sensors.obstacles import obstacle_boxes
from tracker.simulation.sensors.projection import Pose, project
from tracker.simulation.sequence import SimulatedSequence

Image = NDArray[np.uint8]

CODEC = "mp4v"
SLOWEST_HZ = 1.0  # players stumble over slower videos: a radar's scans are shown faster
TILE_M = 2.0
GROUND_X_M, GROUND_Y_M = (-60.0, 60.0), (6.0, 120.0)
TOP_VIEW_PX = 720
SKY, GROUND, STONE, OBSTACLE = (216, 205, 196), (128, 132, 134), (140, 145, 148), (96, 104, 108)
BAR = (250, 250, 250)


def render(sequence: SimulatedSequence) -> Iterator[Image]:
    """One (height, width, 3) picture a delivered frame, blue-green-red as opencv has it.

    Raises UsageError where opencv is not installed.
    """
    cv2 = _opencv()
    starts = np.searchsorted(sequence.objects.frame, np.arange(len(sequence.frames) + 1))
    camera = isinstance(sequence.settings, CameraSceneSettings)
    top = None if camera else _TopView(sequence)
    for k in range(len(sequence.frames)):
        rows = slice(int(starts[k]), int(starts[k + 1]))
        if top is None:
            yield _camera_picture(cv2, sequence, k, rows)
        else:
            yield top.picture(cv2, rows)


def write_video(sequence: SimulatedSequence, path: Path, frames: Iterator[Image]) -> None:
    """Write pictures as an MP4, complete or not at all; lost frames are left out.

    Raises OutputError if the file cannot be written or opencv cannot encode it, UsageError
    where opencv is not installed.
    """
    cv2 = _opencv()
    rate = max(sequence.facts.frame_rate_hz or SLOWEST_HZ, SLOWEST_HZ)
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
    except OSError as error:
        raise OutputError(f"cannot be written: {error.strerror}", path=path) from None
    with atomic_file(path) as working:
        count = _encode(cv2, str(working), rate, frames)
        _check(cv2, str(working), count, path)


def _encode(cv2: Any, path: str, rate: float, frames: Iterator[Image]) -> int:
    writer = None
    count = 0
    for picture in frames:
        if writer is None:
            size = (picture.shape[1], picture.shape[0])
            writer = cv2.VideoWriter(path, cv2.VideoWriter.fourcc(*CODEC), rate, size)
        writer.write(picture)
        count += 1
    if writer is not None:
        writer.release()
    return count


def _check(cv2: Any, working: str, count: int, path: Path) -> None:
    """Opencv reports no error when a codec is missing: read the file back."""
    video = cv2.VideoCapture(working)
    found = int(video.get(cv2.CAP_PROP_FRAME_COUNT)) if video.isOpened() else 0
    readable, _ = video.read() if found else (False, None)
    video.release()
    if found != count or not readable:
        raise OutputError(
            f"opencv wrote {found} readable frames of {count}; is its '{CODEC}' codec there?",
            path=path,
        )


def _opencv() -> Any:
    try:
        import cv2
    except ImportError:
        raise UsageError(
            "--video needs opencv: python3 -m pip install opencv-python-headless"
        ) from None
    return cv2


def _camera_picture(cv2: Any, sequence: SimulatedSequence, k: int, rows: slice) -> Image:
    settings = cast(CameraSceneSettings, sequence.settings)
    picture = _ground(cv2, sequence, k)
    pose = cast(Pose, sequence.pose).rows(np.array([k]))
    boxes, depth = obstacle_boxes(settings.site, pose, settings.camera)
    things = [(far, box, -1, "") for far, box in zip(depth[0].tolist(), boxes[0], strict=True)]
    objects = sequence.objects
    foot = np.concatenate((objects.xy[rows], np.zeros((rows.stop - rows.start, 1))), axis=1)
    distance = project(foot[None], pose, settings.camera)[1][0]
    labels = [sequence.labels[code] for code in objects.label[rows].tolist()]
    things += zip(
        distance.tolist(), objects.values[rows], objects.object[rows].tolist(), labels, strict=True
    )
    for _, box, number, label in sorted(things, key=lambda thing: -thing[0]):
        _body(cv2, picture, box, number, label)
    return picture


def _ground(cv2: Any, sequence: SimulatedSequence, k: int) -> Image:
    """Paving stones of two greys on the ground plane under a plain sky."""
    settings = cast(CameraSceneSettings, sequence.settings)
    camera = settings.camera
    pose = cast(Pose, sequence.pose).rows(np.array([k]))
    x = np.arange(*GROUND_X_M, TILE_M)
    y = np.arange(*GROUND_Y_M, TILE_M)
    corner = np.array([(0, 0), (TILE_M, 0), (TILE_M, TILE_M), (0, TILE_M)])
    tiles = np.stack(np.meshgrid(x, y), axis=-1).reshape(-1, 1, 2) + corner
    world = np.concatenate((tiles, np.zeros((*tiles.shape[:2], 1))), axis=-1).reshape(1, -1, 3)
    image, _ = project(world, pose, camera)
    image = np.rint(image.reshape(-1, 4, 2)).astype(np.int32)
    picture = np.full((camera.image_height, camera.image_width, 3), SKY, np.uint8)
    horizon = image[..., 1].min()
    picture[max(int(horizon), 0) :] = GROUND
    light = np.random.default_rng(0).random(len(tiles)) < 0.5
    for tile in image[light]:
        cv2.fillConvexPoly(picture, tile, STONE)
    return picture


def _body(cv2: Any, picture: Image, box: Floats, number: int, label: str) -> None:
    """A patch with a texture of its own, so that pictures can be matched; people get a head."""
    left, top, width, height = box.tolist()
    low = (round(left), round(top))
    high = (round(left + width), round(top + height))
    if number < 0:
        cv2.rectangle(picture, low, high, OBSTACLE, -1)
        return
    rng = np.random.default_rng(number)
    coat = rng.integers(40, 215, (1, 1, 3))
    patch = np.clip(coat + rng.integers(-45, 45, (6, 3, 3)), 0, 255).astype(np.uint8)
    head = 0.16 * height if label == "person" else 0.0
    _paste(cv2, picture, patch, low[0], round(top + head), high[0], high[1])
    if head:
        centre = (round(left + 0.5 * width), round(top + 0.55 * head))
        tone = tuple(int(value) for value in rng.integers(70, 200, 1).repeat(3))
        cv2.circle(picture, centre, max(round(0.55 * head), 1), tone, -1, cv2.LINE_AA)


def _paste(cv2: Any, picture: Image, patch: Image, *corners: int) -> None:
    left, top, right, bottom = corners
    right, bottom = max(right, left + 1), max(bottom, top + 1)
    height, width = picture.shape[:2]
    inner = (max(left, 0), max(top, 0), min(right, width), min(bottom, height))
    if inner[0] >= inner[2] or inner[1] >= inner[3]:
        return
    full = cv2.resize(patch, (right - left, bottom - top), interpolation=cv2.INTER_NEAREST)
    picture[inner[1] : inner[3], inner[0] : inner[2]] = full[
        inner[1] - top : inner[3] - top, inner[0] - left : inner[2] - left
    ]


class _TopView:
    """A plan view for sensors that measure on the ground: x to the right, y up."""

    def __init__(self, sequence: SimulatedSequence) -> None:
        self._sequence = sequence
        low, high = sequence.objects.xy.min(axis=0), sequence.objects.xy.max(axis=0)
        span = np.maximum(high - low, 1e-6)
        self._scale = 0.9 * TOP_VIEW_PX / span.max()
        size = np.ceil(self._scale * span + 0.1 * TOP_VIEW_PX).astype(int)
        self._width, self._height = (int(value + value % 2) for value in size)
        self._low = low - 0.05 * TOP_VIEW_PX / self._scale

    def picture(self, cv2: Any, rows: slice) -> Image:
        picture = np.full((self._height, self._width, 3), GROUND, np.uint8)
        objects = self._sequence.objects
        for k in range(rows.start, rows.stop):
            rng = np.random.default_rng(int(objects.object[k]))
            colour = tuple(int(value) for value in rng.integers(40, 230, 3))
            corners = self._pixels(self._outline(k))
            cv2.fillConvexPoly(picture, corners, colour, cv2.LINE_AA)
            if objects.shape is not None:  # a bar across the front
                front = (corners[0].tolist(), corners[1].tolist())
                cv2.line(picture, *front, BAR, 2, cv2.LINE_AA)
        return picture

    def _outline(self, k: int) -> Floats:
        objects = self._sequence.objects
        if objects.shape is not None:
            length, width, heading = objects.shape[k]
        elif self._sequence.kind is Kind.BOX:
            (length, width), heading = objects.values[k, 2:], 0.0
        else:
            length, width, heading = 8.0 / self._scale, 8.0 / self._scale, 0.0
        ahead = np.array([np.cos(heading), np.sin(heading)]) * 0.5 * length
        aside = np.array([-np.sin(heading), np.cos(heading)]) * 0.5 * width
        corners = np.array([ahead + aside, ahead - aside, -ahead - aside, aside - ahead])
        return objects.xy[k] + corners

    def _pixels(self, points: Floats) -> NDArray[np.int32]:
        x, y = ((points - self._low) * self._scale).T
        return np.rint(np.stack((x, self._height - y), axis=1)).astype(np.int32)
