"""The camera's motion in a video: what was put in comes out."""

import cv2
import numpy as np
import pytest

from tracker import Engine, load_settings
from tracker.errors import InputError
from tracker.log.model import Frame
from tracker.motion.video import VideoCamera

WIDTH, HEIGHT = 480, 320
EMPTY = np.empty((0, 4))


def ground(seed=1):
    """A large textured picture to look at."""
    rng = np.random.default_rng(seed)
    coarse = rng.integers(0, 255, (60, 80, 3)).astype(np.uint8)
    return cv2.resize(coarse, (4 * WIDTH, 4 * HEIGHT), interpolation=cv2.INTER_CUBIC)


def video(path, steps, boxes=None):
    """The camera over the ground: pictures that each step (shift x, y, zoom, rotation about the
    centre) moves; a box of the picture that stays where it is, if wanted."""
    writer = cv2.VideoWriter(str(path), cv2.VideoWriter.fourcc(*"mp4v"), 25.0, (WIDTH, HEIGHT))
    picture = ground()
    whole = np.array([[1.0, 0.0, -1.5 * WIDTH], [0.0, 1.0, -1.5 * HEIGHT], [0.0, 0.0, 1.0]])
    centre = np.array([WIDTH, HEIGHT]) / 2.0
    for x, y, zoom, turn in [(0.0, 0.0, 0.0, 0.0), *steps]:
        block = np.array([[1.0 + zoom, -turn], [turn, 1.0 + zoom]])
        step = np.eye(3)
        step[:2, :2] = block
        step[:2, 2] = centre - block @ centre + (x, y)
        whole = step @ whole
        shown = cv2.warpAffine(picture, whole[:2], (WIDTH, HEIGHT))
        for left, top, width, height in boxes or []:
            shown[top : top + height, left : left + width] = ground(7)[:height, :width]
        writer.write(shown)
    writer.release()


def frame(number, corners=EMPTY):
    return Frame.of_boxes(number, 0.04 * number, corners)


def test_steps_come_out(tmp_path):
    """To a fifth of a pixel and a thousandth; the video is compressed."""
    rng = np.random.default_rng(2)
    steps = np.column_stack((rng.normal(0, 5, (8, 2)), rng.normal(0, 0.01, (8, 2))))
    video(tmp_path / "v.mp4", steps)
    camera = VideoCamera(tmp_path / "v.mp4")
    assert camera.step(frame(1)) is None
    for k, step in enumerate(steps):
        found = camera.step(frame(k + 2))
        assert found.support > 50
        np.testing.assert_allclose(found.centre, [WIDTH / 2, HEIGHT / 2])
        np.testing.assert_allclose(found.parameters[:2], step[:2], atol=0.2)
        np.testing.assert_allclose(found.parameters[2:], step[2:], atol=1e-3)


def test_frames_that_the_log_leaves_out_are_counted_in(tmp_path):
    video(tmp_path / "v.mp4", [(4.0, -2.0, 0.0, 0.0)] * 6)
    camera = VideoCamera(tmp_path / "v.mp4")
    camera.step(frame(1))
    found = camera.step(frame(5))
    np.testing.assert_allclose(found.parameters, [16.0, -8.0, 0.0, 0.0], atol=0.3)


def test_what_is_in_boxes_is_not_looked_at(tmp_path):
    """Two thirds of the picture stand still, as a parked lorry before a moving camera would not."""
    still = [(0, 0, 320, 320)]
    video(tmp_path / "v.mp4", [(4.0, 0.0, 0.0, 0.0)] * 3, still)
    masked, plain = VideoCamera(tmp_path / "v.mp4"), VideoCamera(tmp_path / "v.mp4")
    for number in (1, 2, 3):
        found = masked.step(frame(number, np.array(still, float)))
        misled = plain.step(frame(number))
    assert found.parameters[0] == pytest.approx(4.0, abs=0.2)
    assert misled.parameters[0] == pytest.approx(0.0, abs=0.5)


def test_a_picture_without_corners_says_nothing(tmp_path):
    writer = cv2.VideoWriter(
        str(tmp_path / "v.mp4"), cv2.VideoWriter.fourcc(*"mp4v"), 25.0, (WIDTH, HEIGHT)
    )
    for _ in range(3):
        writer.write(np.full((HEIGHT, WIDTH, 3), 90, np.uint8))
    writer.release()
    camera = VideoCamera(tmp_path / "v.mp4")
    assert [camera.step(frame(n)) for n in (1, 2, 3)] == [None] * 3


def test_errors_name_the_video(tmp_path):
    with pytest.raises(InputError, match="no such video"):
        VideoCamera(tmp_path / "none.mp4")
    (tmp_path / "text.mp4").write_text("not a video")
    with pytest.raises(InputError, match="cannot be read as a video"):
        VideoCamera(tmp_path / "text.mp4")
    video(tmp_path / "v.mp4", [(0.0, 0.0, 0.0, 0.0)])
    camera = VideoCamera(tmp_path / "v.mp4")
    camera.step(frame(2))
    with pytest.raises(InputError, match="no picture 3; the log has frame 5"):
        camera.step(frame(5))


def test_the_engine_moves_tracks_by_what_it_is_told(tmp_path):
    """One object, which alone says nothing about the camera, jumps with the picture."""
    steps = [(0.0, 0.0, 0.0, 0.0)] * 4 + [(25.0, 0.0, 0.0, 0.0)] * 3
    video(tmp_path / "v.mp4", steps)
    lived = {}
    for name in ("told", "alone"):
        camera = VideoCamera(tmp_path / "v.mp4")
        engine = Engine(load_settings(None), "box")
        for number in range(1, 9):
            x = 100.0 + 25.0 * max(0, number - 5)
            seen = frame(number, [[x, 100.0, 20.0, 40.0]])
            result = engine.step(seen, camera.step(seen) if name == "told" else None)
        lived[name] = result.track.tolist()
    assert lived["told"] == [1]
    assert lived["alone"] != [1]
