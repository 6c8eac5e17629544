"""A sensor that moves, and the noise that a log's own tracks show."""

import numpy as np
import pytest

from tests.hindsight.scenes import RATE, collected, crossing, log_of, settings, walk
from tracker.hindsight.look_back import in_common_frame, look_back
from tracker.hindsight.noise import likeliest_noise
from tracker.hindsight.stabilise import CommonFrame, measure_common_motion
from tracker.log.model import Kind
from tracker.motion import motion_model

SWAY = 6.0  # metres, of the sensor, in both axes


def sway(frame):
    """(n, 2) where the sensor has moved to: the engine follows, no one predicts it for 3 s."""
    phase = np.asarray(frame) / RATE
    return SWAY * np.column_stack((np.sin(1.3 * phase), np.cos(0.9 * phase)))


def test_there_and_back_again():
    rng = np.random.default_rng(0)
    maps = np.zeros((5, 2, 3))
    for k in range(5):  # turned, scaled and shifted
        angle, scale = 0.2 * k, 1.0 + 0.1 * k
        maps[k, :, :2] = scale * np.array(
            [[np.cos(angle), -np.sin(angle)], [np.sin(angle), np.cos(angle)]]
        )
        maps[k, :, 2] = rng.normal(0, 9, 2)
    common = CommonFrame(maps)
    z = rng.uniform(1, 90, (20, 4))
    scan = rng.integers(0, 5, 20)
    np.testing.assert_allclose(common.scale(scan), 1.0 + 0.1 * scan)
    there = common.forth(z, scan)
    spread = np.repeat(np.diag([4.0, 9.0, 1.0, 2.0])[None], 20, axis=0)
    back, _, covariance = common.back(there, z, spread, scan)
    np.testing.assert_allclose(back, z, rtol=1e-12)
    # Lengths shrink by the scale on the way back; trace and determinant are free of the turn.
    shrunk = np.trace(covariance[:, :2, :2], axis1=1, axis2=2)
    np.testing.assert_allclose(shrunk, 13.0 / (1.0 + 0.1 * scan) ** 2)
    np.testing.assert_allclose(covariance[:, 3, 3], 2.0 / (1.0 + 0.1 * scan) ** 2)


def test_steps_add_up():
    """A point that stands still in the world is at one place in the common frame."""
    rng = np.random.default_rng(3)
    steps = np.zeros((6, 2, 3))
    place = [np.array([3.0, 4.0])]
    for k in range(6):
        angle = rng.normal(0, 0.2)
        steps[k, :, :2] = 1.1 * np.array(
            [[np.cos(angle), -np.sin(angle)], [np.sin(angle), np.cos(angle)]]
        )
        steps[k, :, 2] = rng.normal(0, 5, 2)
        if k:
            place.append(steps[k, :, :2] @ place[-1] + steps[k, :, 2])
    there = CommonFrame.of_steps(steps).forth(np.array(place), np.arange(6))
    np.testing.assert_allclose(there, np.repeat([[3.0, 4.0]], 6, axis=0), atol=1e-9)


def test_a_known_motion_is_used_if_it_predicts_better():
    frame, z = staggered()
    log = log_of(frame, z + sway(frame))
    chosen = settings("motion.acceleration_noise=8", "hindsight.noise=measured")
    collector, born = collected(log, chosen)
    numbers = np.arange(1, log.frame_count + 1)
    true = CommonFrame.shifts(-sway(numbers))
    wrong = CommonFrame.shifts(9.0 * sway(3 * numbers))
    found = look_back(log, collector, chosen, born, true)
    assert found.common is true
    assert links_of(found) >= 17
    assert look_back(log, collector, chosen, born, wrong).common is not wrong


def test_a_still_sensor_changes_nothing():
    z = np.random.default_rng(1).normal(size=(6, 4))
    scan = np.array([0, 1, 2, 2, 1, 0])
    assert np.array_equal(CommonFrame.still(3).forth(z, scan), z)


def test_the_sensors_motion_is_what_tracks_have_in_common():
    frame, z, _ = crossing(hidden=())
    moved = log_of(frame, z + sway(frame))
    collector, _ = collected(moved, settings("motion.acceleration_noise=8"))
    scans, pieces = collector.finish()
    common = measure_common_motion(pieces, len(scans.time), moved.z)
    busy = slice(20, 130)
    error = common.maps[busy, :, 2] + sway(scans.number[busy])
    error[:, 0] += 2.0 * scans.time[busy]  # they all walk at 2 m/s, and the frame with them
    error -= error.mean(axis=0)
    # The median of a dozen detections with 0.3 m is good to 0.1 m a step; steps of one
    # detection cancel, those of different ones add up.
    assert np.sqrt(np.mean(error**2)) < 0.5
    assert SWAY > 10 * 0.5


def test_too_few_witnesses_say_nothing():
    frame, z, _ = crossing(objects=2, hidden=())
    log = log_of(frame, z + sway(frame))
    collector, _ = collected(log, settings("motion.acceleration_noise=8"))
    scans, pieces = collector.finish()
    common = measure_common_motion(pieces, len(scans.time), log.z)
    assert np.array_equal(common.maps, CommonFrame.still(len(scans.time)).maps)


def links_made(log, *overrides):
    chosen = settings("motion.acceleration_noise=8", "hindsight.noise=measured", *overrides)
    collector, born = collected(log, chosen)
    return links_of(look_back(log, collector, chosen, born))


def links_of(found):
    """How many links there are between different tracks."""
    return int((found.links.made & ~found.links.own).sum())


def staggered():
    """Every object is hidden for 3 s, but never all of them at once."""
    frames, places = [], []
    for k, hidden in enumerate(((30, 60), (60, 90), (90, 120))):
        frame, z, _ = crossing(seed=20 + k, objects=6, hidden=(hidden,))
        frames.append(frame)
        places.append(z + np.array([0.0, 100.0 * k]))
    return np.concatenate(frames), np.concatenate(places)


def test_links_survive_a_moving_sensor():
    frame, z = staggered()
    log = log_of(frame, z + sway(frame))
    # All but those that the motion, known to some tenths of a metre, leaves doubtful.
    assert links_made(log, "hindsight.common_motion=measured") >= 15
    assert links_made(log) < 9


def test_a_still_sensor_does_not_suffer():
    frame, z = staggered()
    log = log_of(frame, z)
    assert links_made(log, "hindsight.common_motion=measured") == links_made(log) == 18


@pytest.mark.parametrize("noise", [0.2, 1.6])
def test_the_measured_noise_is_the_true_one(noise):
    """Between neighbours of a grid of powers of two."""
    rng = np.random.default_rng(7)
    frame, z = [], []
    for k in range(40):
        states = walk(rng, 100, (0.0, 100.0 * k), rng.normal(0, 2, 2), noise)
        frame += list(range(1, 101))
        z += (states[:, :2] + rng.normal(0, 0.3, (100, 2))).tolist()
    log = log_of(frame, z)
    chosen = settings("motion.acceleration_noise=3.2")
    collector, _ = collected(log, chosen)
    scans, pieces = collector.finish()
    model = motion_model(chosen, Kind.POINT)
    z, variance = in_common_frame(log, pieces, CommonFrame.still(100), model)
    found, _ = likeliest_noise(chosen, Kind.POINT, pieces, scans, z, variance)
    assert 0.5 * noise <= found.motion.acceleration_noise <= 2.0 * noise


def test_too_few_detections_leave_the_noise_as_it_is():
    frame, z, _ = crossing(objects=1, steps=30, hidden=())
    log = log_of(frame, z)
    chosen = settings("motion.acceleration_noise=3.2")
    collector, _ = collected(log, chosen)
    scans, pieces = collector.finish()
    model = motion_model(chosen, Kind.POINT)
    z, variance = in_common_frame(log, pieces, CommonFrame.still(len(scans.time)), model)
    found, likelihood = likeliest_noise(chosen, Kind.POINT, pieces, scans, z, variance)
    assert found is chosen
    assert likelihood == -np.inf
