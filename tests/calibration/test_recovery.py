"""Worlds with known parameters: what was put in is found again."""

from __future__ import annotations

import math

import pytest

from tests.calibration.worlds import world
from tracker import Settings, calibrate
from tracker.calibration.settings_file import calibrated_toml, table
from tracker.errors import InputError, UsageError
from tracker.log.model import Kind
from tracker.settings import load_settings

REACH = 3.0  # ten sigmas
BOXES = {"sigma": 0.05, "frames": 60, "size_noise": 0.02, "speed": 1.0}


@pytest.fixture(scope="module")
def points():
    return calibrate(*world(), distance_threshold=REACH)


@pytest.fixture(scope="module")
def boxes():
    return calibrate(
        *world(
            Kind.BOX, sigma=0.05, frames=60, objects=60, size_noise=0.02, speed=1.0, clutter=15.0
        )
    )


def measured(found, name):
    return next(item for item in found.evidence if item.setting == name)


def test_points_are_recovered(points):
    # 4800 object rows: a standard error of 0.005 of P_D, so that 0.02 is four of them. 1600 false
    # detections: 2.5%, so that 10% is four. 4000 innovations: sigma within 2% or so, root q 5%.
    assert points.settings.sensor.detection_probability == pytest.approx(0.85, abs=0.02)
    assert measured(points, "clutter_per_frame").value == pytest.approx(4.0, rel=0.1)
    assert points.settings.measurement.position_sigma == pytest.approx(0.3, rel=0.1)
    assert measured(points, "sigma_x").value == pytest.approx(0.3, rel=0.1)
    assert abs(math.log(points.settings.motion.acceleration_noise / 0.5)) < math.log(1.5)


def test_boxes_are_recovered(boxes):
    # 3600 rows, 900 false detections: standard errors of 0.006 and 3.3%. Sizes wander little in
    # 6 s, so that box scales stay about what the world was made in.
    assert boxes.settings.sensor.detection_probability == pytest.approx(0.85, abs=0.02)
    assert measured(boxes, "clutter_per_frame").value == pytest.approx(15.0, rel=0.1)
    assert boxes.settings.measurement.position_sigma == pytest.approx(0.05, rel=0.1)
    assert boxes.settings.measurement.size_sigma == pytest.approx(0.05, rel=0.1)
    assert abs(math.log(boxes.settings.motion.acceleration_noise / 0.5)) < math.log(1.5)
    assert abs(math.log(boxes.settings.motion.size_noise / 0.02)) < math.log(1.5)


def test_density_of_uniform_clutter(points):
    # 4 false detections a frame on 400 by 400; the hull of all detections is a little larger,
    # as objects leave, unless it is counted near objects, where there are too few.
    value = points.settings.cost.new_density
    assert value is None or 0.2 * 4 / 400**2 < value < 1.5 * 4 / 400**2


def test_matched_filter_is_consistent(points):
    facts = points.consistency
    assert facts["low"] < facts["mean"] < facts["high"]


def test_without_truth_noise_is_still_found():
    log, _ = world(
        Kind.BOX, sigma=0.05, frames=60, objects=30, size_noise=0.02, speed=1.0, clutter=1.0
    )
    found = calibrate(log)
    # Tracks of the engine, not of the truth, hence wider: a few contain clutter.
    assert found.settings.measurement.position_sigma == pytest.approx(0.05, rel=0.2)
    assert "gate" in measured(found, "measurement.position_sigma").method


def test_same_input_same_bytes_and_a_file_that_can_be_read(points, tmp_path):
    again = calibrate(*world(), distance_threshold=REACH)
    assert calibrated_toml(again) == calibrated_toml(points)
    assert table(again) == table(points)
    file = tmp_path / "s.toml"
    file.write_text(calibrated_toml(points), encoding="utf-8")
    assert load_settings(file) == points.settings


def test_few_observations_keep_the_defaults():
    found = calibrate(*world(frames=3, objects=5), distance_threshold=REACH)
    assert found.settings.sensor == Settings().sensor
    assert found.settings.motion == Settings().motion
    assert "kept the default, only 15 observations" in calibrated_toml(found)


def test_wrong_input_is_told():
    log, truth = world(frames=3)
    _, boxes = world(Kind.BOX, frames=3)
    with pytest.raises(UsageError, match="has point detections, its truth is of kind box"):
        calibrate(log, boxes)
    with pytest.raises(UsageError, match="distance-threshold"):
        calibrate(log, truth)
    with pytest.raises(UsageError, match="1 logs but 2 truths"):
        calibrate(log, [truth, truth], distance_threshold=REACH)
    with pytest.raises(InputError, match="no detection of 'world' matches"):
        calibrate(log, truth, distance_threshold=1e-9)
