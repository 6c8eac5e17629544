"""Tracks end where objects leave, elsewhere they coast."""

import numpy as np
import pytest

from tracker import Engine, Frame, load_settings
from tracker.errors import InputError
from tracker.lifecycle.rules import Reason
from tracker.log.facts import read_facts
from tracker.log.model import SequenceFacts

IMAGE = SequenceFacts(image_width=200.0, image_height=100.0)
DOOR = ((-99.0, 0.0), (20.0, 0.0), (20.0, 100.0), (-99.0, 100.0))


def walk(facts, left, step, share=0.9, frames=8, kind="box"):
    """An object walks for 8 frames, then is not seen for 12: (last frame it lived in, reason)."""
    engine = Engine(load_settings(None, (f"lifecycle.exit_share={share}",)), kind, facts=facts)
    for k in range(frames + 12):
        x = left + step * k
        row = [x, 40.0, 20.0, 40.0] if kind == "box" else [x, 50.0]
        seen = [row] if k < frames else np.empty((0, len(row)))
        make = Frame.of_boxes if kind == "box" else Frame.of_points
        result = engine.step(make(k + 1, 0.1 * k, seen))
        if Reason.LEFT_VIEW in result.transitions.reason:
            return k + 1
    assert len(result.track) == 1
    return None


def test_over_the_border():
    # In frame n the left edge is expected at 110 + 8 (n - 1): 90% out from 198 on, frame 12.
    assert walk(IMAGE, 110.0, 8.0) == 12
    assert walk(IMAGE, 110.0, 8.0, share=0.5) == 11  # 190 on


def test_in_the_middle_it_coasts():
    assert walk(IMAGE, 60.0, 1.0) is None


def test_without_facts_or_switched_off_nothing_is_known():
    assert walk(SequenceFacts(), 110.0, 8.0) is None
    assert Engine(kind="box")._exits is None
    off = load_settings(None)
    assert Engine(off, "box", facts=IMAGE)._exits is not None
    assert Engine(off, "point", facts=IMAGE)._exits is None  # a plane is no image


def test_through_a_door():
    facts = SequenceFacts(exit_zones=(DOOR,))
    assert walk(facts, 64.0, -8.0) == 10  # inside from frame 9 on, first missed there
    assert walk(facts, 60.0, 0.5) is None
    assert walk(facts, 20.75, -0.1, kind="point") == 10  # a point is inside or not


def test_a_seen_track_does_not_end_in_a_door():
    assert walk(SequenceFacts(exit_zones=(DOOR,)), 0.0, 0.0, frames=20) == 22


def test_zones_are_read(tmp_path):
    (tmp_path / "sequence.toml").write_text(
        "exit_zones = [[[-99, 0], [20, 0], [20, 100], [-99, 100]]]"
    )
    assert read_facts(tmp_path / "detections.csv").exit_zones == (DOOR,)


@pytest.mark.parametrize(
    "text",
    ["1", "[[1, 2]]", "[[[0, 0], [1, 1]]]", '[[[0, 0], [1, 0], ["a", 1]]]',
     "[[[0, 0], [2, 2], [2, 0], [0, 2]]]"],
)  # fmt: skip
def test_a_zone_that_is_none(tmp_path, text):
    (tmp_path / "sequence.toml").write_text(f"exit_zones = {text}")
    with pytest.raises(InputError, match="exit_zones"):
        read_facts(tmp_path / "detections.csv")
