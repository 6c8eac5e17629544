"""How settings become noise, and what the engine calls."""

import numpy as np
import pytest

from tests.reference import kalman as twin
from tracker.errors import KernelError, SettingsError, UsageError
from tracker.log.model import Kind
from tracker.motion import ConstantVelocity, motion_model
from tracker.settings.schema import MeasurementSettings, MotionSettings, Settings

MOTION = MotionSettings(
    acceleration_noise=3.0,
    size_noise=0.5,
    initial_speed_sigma=2.0,
    initial_size_rate_sigma=0.1,
)
BOX = np.array([[10.0, 20.0, 4.0, 9.0]])  # box scale 6
POINT = np.array([[10.0, 20.0]])


def model(kind, **measurement):
    settings = Settings(
        motion=MOTION,
        measurement=MeasurementSettings(position_sigma=0.2, size_sigma=0.3, **measurement),
    )
    return motion_model(settings, kind)


def known_exactly(z):
    """A state at rest without any uncertainty."""
    n, d = z.shape
    return np.hstack((z, np.zeros((n, d)))), np.zeros((n, 2 * d, 2 * d))


def test_acceleration_noise_of_boxes_is_in_box_scales():
    mean, covariance = known_exactly(BOX)
    model(Kind.BOX).predict(mean, covariance, 0.5)
    density = [(3.0 * 6) ** 2, (3.0 * 6) ** 2, (0.5 * 6) ** 2, (0.5 * 6) ** 2]
    np.testing.assert_allclose(covariance[0], twin.process_noise(density, 0.5), rtol=1e-13)


def test_acceleration_noise_of_points_is_in_length_units():
    mean, covariance = known_exactly(POINT)
    model(Kind.POINT).predict(mean, covariance, 0.5)
    np.testing.assert_allclose(covariance[0], twin.process_noise([9.0, 9.0], 0.5), rtol=1e-13)


def test_predict_moves_states_by_the_time_that_passed():
    mean, covariance = known_exactly(POINT)
    mean[0, 2:] = (4.0, -2.0)
    model(Kind.POINT).predict(mean, covariance, 1.5)
    assert mean[0].tolist() == [16.0, 17.0, 4.0, -2.0]


def test_no_time_and_no_tracks_change_nothing():
    motion = model(Kind.BOX)
    mean, covariance = known_exactly(BOX)
    motion.predict(mean, covariance, 0.0)
    assert np.array_equal(mean[:, :4], BOX)
    assert not covariance.any()
    empty = np.empty((0, 8)), np.empty((0, 8, 8))
    motion.predict(*empty, 1.0)
    motion.update(*empty, np.empty(0, np.int64), np.empty((0, 4)), np.empty((0, 4)))
    assert motion.measurement_variance(np.empty((0, 4)), None).shape == (0, 4)
    assert [array.shape for array in motion.initiate(np.empty((0, 4)), np.empty((0, 4)))] == [
        (0, 8),
        (0, 8, 8),
    ]


@pytest.mark.parametrize("sides", [(-3.0, 2.0), (0.0, 0.0), (-1.0, -1.0)])
def test_a_box_that_shrank_away_while_coasting_stays_usable(sides):
    motion = model(Kind.BOX)
    mean, covariance = motion.initiate(BOX, motion.measurement_variance(BOX, None))
    mean[0, 2:4] = sides
    motion.predict(mean, covariance, 0.1)
    assert np.isfinite(covariance).all()
    motion.update(mean, covariance, np.zeros(1, np.int64), BOX, np.full((1, 4), 0.1))
    assert np.linalg.eigvalsh(covariance[0]).min() > 0.0


@pytest.mark.parametrize(
    ("kind", "unit", "sigmas"),
    [
        (Kind.BOX, "auto", (1.2, 1.2, 1.8, 1.8)),
        (Kind.BOX, "box-scales", (1.2, 1.2, 1.8, 1.8)),
        (Kind.BOX, "absolute", (0.2, 0.2, 0.3, 0.3)),
        (Kind.POINT, "auto", (0.2, 0.2)),
        (Kind.POINT, "absolute", (0.2, 0.2)),
    ],
)
def test_measurement_noise_in_its_unit(kind, unit, sigmas):
    z = BOX if kind is Kind.BOX else POINT
    found = model(kind, unit=unit).measurement_variance(z, None)
    np.testing.assert_allclose(found[0], np.square(sigmas), rtol=1e-13)


def test_a_detection_s_own_sigmas_go_first():
    sigma = np.array([[0.7, np.nan, 0.4, np.nan]])
    found = model(Kind.BOX).measurement_variance(BOX, sigma)
    np.testing.assert_allclose(found[0], np.square([0.7, 1.2, 0.4, 1.8]), rtol=1e-13)
    assert np.isnan(sigma[0, 1])  # the caller's array is left alone


@pytest.mark.parametrize("unusable", [0.0, -2.0, np.inf])
def test_sigmas_that_are_none(unusable):
    with pytest.raises(UsageError, match=r"detection 0 of the frame has sigmas .*positive"):
        model(Kind.POINT).measurement_variance(POINT, np.array([[1.0, unusable]]))


def test_points_have_no_box_scale():
    with pytest.raises(SettingsError, match=r"measurement\.unit: .*'absolute' or 'auto'"):
        model(Kind.POINT, unit="box-scales")


def test_birth_is_at_rest_with_the_settings_prior():
    motion = model(Kind.BOX)
    mean, covariance = motion.initiate(BOX, np.array([[1.0, 2.0, 3.0, 4.0]]))
    assert mean.tolist() == [[10.0, 20.0, 4.0, 9.0, 0.0, 0.0, 0.0, 0.0]]
    speed, size_rate = (2.0 * 6) ** 2, (0.1 * 6) ** 2
    np.testing.assert_allclose(
        covariance[0],
        np.diag([1.0, 2.0, 3.0, 4.0, speed, speed, size_rate, size_rate]),
        rtol=1e-13,
    )
    _, covariance = model(Kind.POINT).initiate(POINT, np.ones((1, 2)))
    assert np.diag(covariance[0]).tolist() == [1.0, 1.0, 4.0, 4.0]


def test_an_indefinite_innovation_names_its_row():
    mean, covariance = known_exactly(np.vstack((POINT, POINT)))
    covariance[1] = -np.eye(4)
    with pytest.raises(KernelError, match="row 1"):
        model(Kind.POINT).update(
            mean, covariance, np.array([0, 1]), np.vstack((POINT, POINT)), np.full((2, 2), 0.1)
        )


def run(motion, boxes, times):
    """Estimates over a sequence in which every detection belongs to its row."""
    pairing = np.arange(boxes.shape[1])
    mean, covariance = motion.initiate(boxes[0], motion.measurement_variance(boxes[0], None))
    for k in range(1, len(boxes)):
        motion.predict(mean, covariance, times[k] - times[k - 1])
        if k % 4:
            variance = motion.measurement_variance(boxes[k], None)
            motion.update(mean, covariance, pairing, boxes[k], variance)
    return mean, covariance


def test_near_and_far_boxes_are_treated_alike():
    """Everything eight times as large gives estimates eight times as large, bit for bit."""
    rng = np.random.default_rng(2)
    boxes = np.abs(rng.normal(40.0, 3.0, (30, 5, 4)))
    times = np.cumsum(rng.uniform(0.02, 0.2, 30))
    motion = ConstantVelocity(Settings(), Kind.BOX)
    mean, covariance = run(motion, boxes, times)
    large_mean, large_covariance = run(motion, 8.0 * boxes, times)
    assert np.array_equal(large_mean, 8.0 * mean)
    assert np.array_equal(large_covariance, 64.0 * covariance)


def test_a_coasting_box_keeps_a_size():
    """One that shrank while it was seen does not turn inside out when it is not."""
    model = ConstantVelocity(Settings(), Kind.BOX)
    mean = np.array([[50.0, 50.0, 20.0, 40.0, 0.0, 0.0, -9.0, -15.0]])
    covariance = np.eye(8)[np.newaxis].copy()
    for _ in range(200):
        model.predict(mean, covariance, 0.1)
        assert (mean[0, 2:4] > 0.0).all()
