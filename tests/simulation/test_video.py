"""The rendered video: written, read back, and showing what is there."""

from __future__ import annotations

from itertools import islice

import numpy as np
import pytest

from tests.simulation.pairs import settings
from tracker.errors import OutputError
from tracker.simulation import simulate
from tracker.simulation.video import render, write_video

cv2 = pytest.importorskip("cv2")


@pytest.mark.parametrize("scene", ["forecourt", "yard", "harbour", "scale"])
def test_a_video_plays_and_has_every_frame(scene, tmp_path):
    changes = {
        "forecourt": ("clock.seconds=0.8",),
        "harbour": ("clock.seconds=20",),
        "scale": ("clock.seconds=0.4", "drift.objects=50"),
    }
    chosen = settings(scene, *changes.get(scene, ("clock.seconds=1",)))
    sequence = simulate(scene, seed=1, settings=chosen)
    path = tmp_path / "scene.mp4"
    write_video(sequence, path, render(sequence))
    video = cv2.VideoCapture(str(path))
    pictures = []
    while True:
        fine, picture = video.read()
        if not fine:
            break
        pictures.append(picture)
    assert len(pictures) == len(sequence.frames)
    if scene == "forecourt":
        assert pictures[0].shape == (720, 1280, 3)
        assert video.get(cv2.CAP_PROP_FPS) == pytest.approx(12.5)
    # It shows the frame that was drawn: mean difference of a compressed picture in grey values.
    drawn = next(islice(render(sequence), len(pictures) - 1, None))
    assert np.abs(drawn.astype(int) - pictures[-1]).mean() < 6.0
    assert [item.name for item in tmp_path.iterdir()] == ["scene.mp4"]


def test_people_are_where_the_truth_says():
    sequence = simulate("forecourt", seed=1, settings=settings("forecourt", "clock.seconds=0.08"))
    picture = next(render(sequence)).astype(int)
    true = sequence.objects
    for box, visibility in zip(true.values, true.visibility, strict=True):
        if visibility < 1.0:
            continue
        left, top, width, height = box
        body = picture[int(top + 0.4 * height), int(left + 0.2 * width) : int(left + 0.8 * width)]
        ground = body.max(axis=1) - body.min(axis=1) < 12  # paving stones are grey
        assert ground.mean() < 0.5


def test_a_moving_camera_moves_the_ground_and_a_still_one_does_not():
    for scene, moves in (("sway", True), ("forecourt", False)):
        chosen = settings(scene, "clock.seconds=0.5", "site.obstacles=[]")
        pictures = list(render(simulate(scene, seed=1, settings=chosen)))
        corner = [picture[600:, :200].astype(int) for picture in (pictures[0], pictures[-1])]
        assert (np.abs(corner[0] - corner[1]).max() > 0) == moves


def test_a_place_that_cannot_be_written_is_named(tmp_path):
    sequence = simulate("yard", seed=1, settings=settings("yard", "clock.seconds=1"))
    (tmp_path / "file").write_text("", encoding="utf-8")
    with pytest.raises(OutputError, match="cannot be written"):
        write_video(sequence, tmp_path / "file" / "v.mp4", render(sequence))
