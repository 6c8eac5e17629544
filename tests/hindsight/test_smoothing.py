"""Smoothing against filterpy and against simulated truth."""

import numpy as np
import pytest
from filterpy.kalman import KalmanFilter
from scipy.stats import chi2

from tests.hindsight.scenes import RATE, SIGMA, settings, walk
from tests.reference.kalman import process_noise, transition
from tracker.errors import SettingsError
from tracker.hindsight.pieces import Pieces, Scans
from tracker.hindsight.smoothing import (
    batches,
    filter_forward,
    smooth_backward,
    smoothable,
    spread_out,
)
from tracker.log.model import Kind
from tracker.motion import motion_model

NOISE = 0.5


def made(objects=40, steps=60, drop=0.2, seed=0):
    """True states and pieces with gaps, of objects by the model itself."""
    rng = np.random.default_rng(seed)
    truth, piece, scan, z = [], [], [], []
    for k in range(objects):
        states = walk(rng, steps, rng.uniform(-50, 50, 2), rng.normal(0, 2, 2), NOISE)
        truth.append(states)
        seen = np.flatnonzero(rng.random(steps) > drop)
        seen = np.union1d(seen, [0, steps - 1])
        piece += [k] * len(seen)
        scan += seen.tolist()
        z += (states[seen, :2] + rng.normal(0, SIGMA, (len(seen), 2))).tolist()
    piece, scan = np.array(piece), np.array(scan)
    count = len(piece)
    pieces = Pieces(
        np.searchsorted(piece, np.arange(objects + 1)),
        np.arange(1, objects + 1),
        scan,
        np.arange(count),
        piece + 1,
        np.zeros(count),
    )
    scans = Scans(np.arange(1, steps + 1), np.arange(steps) / RATE)
    return np.array(truth), pieces, scans, np.array(z)


@pytest.fixture(scope="module")
def smoothed():
    truth, pieces, scans, z = made()
    model = motion_model(settings(), Kind.POINT)
    variance = model.measurement_variance(z, None)
    grid = spread_out(pieces)
    filtered = filter_forward(model, grid, scans, z, variance)
    states = filter_forward(model, grid, scans, z, variance)
    smooth_backward(model, grid, scans, states)
    return truth, pieces, grid, filtered, states, z


def test_smoothing_equals_filterpys(smoothed):
    """filterpy 1.4.5: KalmanFilter.rts_smoother (F and Q of the step to the next state)."""
    _, _, grid, _, states, z = smoothed
    model = motion_model(settings(), Kind.POINT)
    for k in range(4):
        rows = np.flatnonzero(grid.piece == k)
        begin = z[grid.detection[rows[:1]]]
        mean, covariance = model.initiate(begin, np.full((1, 2), SIGMA**2))
        oracle = KalmanFilter(4, 2)
        oracle.x, oracle.P = mean[0].copy(), covariance[0].copy()
        oracle.F, oracle.H = transition(2, 1 / RATE), np.eye(2, 4)
        oracle.Q, oracle.R = process_noise([NOISE**2] * 2, 1 / RATE), SIGMA**2 * np.eye(2)
        means, covariances = [oracle.x.copy()], [oracle.P.copy()]
        for row in rows[1:]:
            oracle.predict()
            at = grid.detection[row]
            oracle.update(z[at] if at >= 0 else None)
            means.append(oracle.x.copy())
            covariances.append(oracle.P.copy())
        expected, spread, _, _ = oracle.rts_smoother(np.array(means), np.array(covariances))
        # filterpy inverts the prediction; both lose digits the same way, but not the same digits.
        np.testing.assert_allclose(states.mean[rows], expected, rtol=1e-7, atol=1e-7)
        np.testing.assert_allclose(states.covariance[rows], spread, rtol=1e-7, atol=1e-9)


def test_smoothing_is_nearer_to_the_truth_than_filtering(smoothed):
    truth, _, grid, filtered, states, _ = smoothed
    true = truth[grid.piece, grid.scan]
    between = grid.detection < 0

    def error(found, some):
        return np.sqrt(np.mean((found.mean[some] - true[some]) ** 2, axis=0))

    everything = np.ones(len(grid), bool)
    for some in (everything, between):
        assert (error(states, some) < 0.85 * error(filtered, some)).all()


def test_smoothed_covariances_are_consistent(smoothed):
    """Mean NEES inside the 99.9% chi-square interval; one state a piece, as those of one piece
    are correlated. Bar-Shalom, Li and Kirubarajan 2001, section 5.4."""
    truth, _, grid, _, states, _ = smoothed
    for scan in (0, 1, 30, 59):
        rows = np.flatnonzero(grid.scan == scan)
        error = truth[grid.piece[rows], scan] - states.mean[rows]
        solved = np.linalg.solve(states.covariance[rows], error[..., None])[..., 0]
        total = np.einsum("ni,ni->", error, solved)
        low, high = chi2.ppf((0.0005, 0.9995), 4 * len(rows))
        assert low < total < high, (scan, total / len(rows))


def test_smoothed_covariances_stay_covariances():
    """A long track, far better known than what a step adds: no eigenvalue below zero."""
    rng = np.random.default_rng(5)
    steps = 4000
    scans = Scans(np.arange(1, steps + 1), np.arange(steps) / RATE)
    seen = np.array([0, 1, *range(1000, 2000), steps - 1])
    z = np.column_stack((seen / RATE, seen / RATE)) + rng.normal(0, 1e-5, (len(seen), 2))
    count = len(seen)
    pieces = Pieces(
        np.array([0, count]),
        np.array([1]),
        seen,
        np.arange(count),
        np.ones(count, int),
        np.zeros(count),
    )
    model = motion_model(settings("measurement.position_sigma=1e-5"), Kind.POINT)
    grid = spread_out(pieces)
    states = filter_forward(model, grid, scans, z, model.measurement_variance(z, None))
    smooth_backward(model, grid, scans, states)
    scale = np.sqrt(np.diagonal(states.covariance, axis1=1, axis2=2))
    correlation = states.covariance / (scale[:, :, None] * scale[:, None, :])
    assert np.linalg.eigvalsh(correlation).min() > 0.0


def test_the_grid_has_a_row_for_each_scan_of_a_piece():
    _, pieces, _, _ = made(objects=3, steps=9, drop=0.6, seed=4)
    grid = spread_out(pieces)
    assert len(grid) == 3 * 9
    assert (np.diff(grid.scan) >= 0).all()
    follows = grid.before >= 0
    assert np.array_equal(grid.piece[grid.before[follows]], grid.piece[follows])
    assert np.array_equal(grid.scan[grid.before[follows]] + 1, grid.scan[follows])
    assert sorted(grid.detection[grid.detection >= 0].tolist()) == list(range(len(pieces.row)))
    seen = np.flatnonzero(grid.detection >= 0)
    assert np.array_equal(pieces.scan[grid.detection[seen]], grid.scan[seen])
    assert np.array_equal(pieces.of_detection[grid.detection[seen]], grid.piece[seen])


def test_batches_hold_every_piece_once_and_few_rows():
    _, pieces, _, _ = made(objects=20, steps=30)
    found = list(batches(pieces, most_rows=100))
    assert sorted(np.concatenate(found).tolist()) == list(range(20))
    assert max(len(part) for part in found) == 3
    assert [len(part) for part in batches(pieces, most_rows=10)] == [1] * 20


def test_the_batches_do_not_change_the_result(smoothed):
    _, pieces, grid, _, states, z = smoothed
    model = motion_model(settings(), Kind.POINT)
    variance = model.measurement_variance(z, None)
    alone = pieces.only(np.arange(len(pieces)) == 7)
    scans = Scans(np.arange(1, 61), np.arange(60) / RATE)
    own = spread_out(alone)
    found = filter_forward(model, own, scans, z, variance)
    smooth_backward(model, own, scans, found)
    rows = np.flatnonzero(grid.piece == 7)
    assert np.array_equal(found.mean, states.mean[rows])
    assert np.array_equal(found.covariance, states.covariance[rows])


def test_a_model_that_cannot_smooth_is_named():
    class Ballistic:
        states, dimension = 4, 2

    with pytest.raises(SettingsError, match=r"motion: .*Ballistic.* cannot look back"):
        smoothable(Ballistic())
