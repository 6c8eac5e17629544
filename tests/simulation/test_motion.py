"""Motion is what the settings say: a matched filter is consistent, vehicles roll, people walk."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from tests.simulation.pairs import check_standard, settings
from tracker.simulation import SimulatedSequence, simulate
from tracker.simulation.streams import Streams
from tracker.simulation.world.drift import DriftSettings, drift
from tracker.simulation.world.parties import LABELS
from tracker.simulation.world.walkers import walk

TAIL = 0.001


def transition(dt: float, q: float) -> tuple[np.ndarray, np.ndarray]:
    """F and Q of constant velocity with white acceleration (Bar-Shalom et al. 2001, ch. 6)."""
    noise = q**2 * np.array([[dt**3 / 3, dt**2 / 2], [dt**2 / 2, dt]])
    return np.array([[1.0, dt], [0.0, 1.0]]), noise


def textbook_filter(
    z: np.ndarray, r: np.ndarray, dt: float, q: float, mean: np.ndarray, covariance: np.ndarray
) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Kalman filter of (frames, n) measurements of one coordinate of n objects, plain formulas.

    Returns the state (n, 2), its covariance (n, 2, 2) and the NIS of each update (frames, n).
    """
    F, Q = transition(dt, q)
    nis = np.zeros(z.shape)
    for k in range(len(z)):
        mean, covariance = mean @ F.T, F @ covariance @ F.T + Q  # x = F x; P = F P F' + Q
        s = covariance[:, 0, 0] + r[k]  # S = H P H' + R
        gain = covariance[:, :, 0] / s[:, None]  # K = P H' / S
        residual = z[k] - mean[:, 0]  # y = z - H x
        nis[k] = residual**2 / s
        mean = mean + gain * residual[:, None]  # x = x + K y
        covariance = covariance - gain[:, :, None] * covariance[:, None, 0, :]  # P = (I - K H) P
    return mean, covariance, nis


def nees(mean: np.ndarray, covariance: np.ndarray, true: np.ndarray) -> np.ndarray:
    error = true - mean
    return np.einsum("ni,nij,nj->n", error, np.linalg.inv(covariance), error)


def bounds(count: int, degrees: int) -> np.ndarray:
    """Two-sided bounds of an average of `count` chi-square numbers (seeded, at 0.1%)."""
    return stats.chi2.ppf([TAIL / 2, 1 - TAIL / 2], count * degrees) / count


def drifting(objects: int = 200) -> SimulatedSequence:
    """A field so large that nothing reaches its edge."""
    return simulate(
        "scale",
        seed=12,
        settings=settings(
            "scale",
            "drift.kind=point",
            f"drift.objects={objects}",
            "drift.spacing=100000",
            "drift.life_seconds=0",
            "drift.clutter_per_object=0",
            "drift.acceleration_noise=40",
            "detection.probability=1",
            "clock.seconds=3",
        ),
    )


def filtered_drift(q: float) -> tuple[np.ndarray, np.ndarray]:
    sequence = drifting()
    by_object = np.lexsort((sequence.detections.origin, sequence.detections.frame))
    z = sequence.log().z[by_object].reshape(len(sequence.frames), 200, 2)
    field, noise = sequence.settings.drift, sequence.settings.noise
    r = (noise.position_sigma * field.size) ** 2
    dt = 1.0 / sequence.settings.clock.frame_rate_hz
    all_nees, all_nis = [], []
    for axis in (0, 1):
        start = np.column_stack((z[0, :, axis], np.zeros(200)))
        covariance = np.tile(np.diag([r, field.speed_sigma**2]), (200, 1, 1))
        mean, covariance, nis = textbook_filter(
            z[1:, :, axis], np.full((len(z) - 1, 200), r), dt, q, start, covariance
        )
        true = np.column_stack(
            (sequence.objects.xy[-200:, axis], sequence.objects.velocity[-200:, axis])
        )
        all_nees.append(nees(mean, covariance, true))
        all_nis.append(nis.ravel())
    return np.concatenate(all_nees), np.concatenate(all_nis)


def test_a_matched_filter_is_consistent_on_scale():
    """NEES and NIS in their bounds (Bar-Shalom, Li and Kirubarajan 2001, sec. 5.4)."""
    found_nees, found_nis = filtered_drift(q=40.0)
    low, high = bounds(len(found_nees), 2)
    assert low < found_nees.mean() < high
    low, high = bounds(len(found_nis), 1)
    assert low < found_nis.mean() < high


@pytest.mark.parametrize("q", [40.0 / 2.0, 40.0 * 2.0])
def test_a_filter_with_half_or_double_the_noise_is_not(q):
    """The check above has the power to see a factor of two."""
    low, high = bounds(400, 2)
    assert not low < filtered_drift(q)[0].mean() < high


def test_steps_of_the_drift_have_the_textbook_covariance():
    """Steps whitened by the Cholesky factor of Q are independent standard normal numbers."""
    times = np.array([0.0, 0.7, 2.0])  # uneven on purpose
    field = DriftSettings(objects=3000, spacing=1e5, life_seconds=0.0, acceleration_noise=40.0)
    movement = drift(field, times, Streams(5))
    xy, velocity = (part.reshape(3, 3000, 2) for part in (movement.xy, movement.velocity))
    for k, dt in enumerate(np.diff(times)):
        moved = xy[k + 1] - xy[k] - dt * velocity[k]
        step = np.stack((moved, velocity[k + 1] - velocity[k]), axis=-1).reshape(-1, 2)
        factor = np.linalg.cholesky(transition(dt, 40.0)[1])
        check_standard(np.linalg.solve(factor, step.T).T)


def test_drift_stays_in_the_field_and_renews_itself():
    sequence = simulate("scale", seed=1, settings=settings("scale", "drift.life_seconds=2"))
    side = sequence.settings.drift.side
    xy, number = sequence.objects.xy, sequence.objects.object
    assert xy.min() >= 0.0
    assert xy.max() <= side
    assert np.all(np.bincount(sequence.objects.frame) == 1000)
    # 99 steps x 1000 objects, each replaced with probability 1 - exp(-0.04 / 2).
    low, high = stats.binom.interval(1 - TAIL, 99_000, -np.expm1(-0.02))
    assert low <= number.max() - 1000 <= high
    # Uniform at the end as well as at the beginning.
    for k in (0, 99):
        assert stats.kstest(xy[sequence.objects.frame == k, 0] / side, "uniform").pvalue > TAIL


def test_a_matched_filter_is_consistent_in_the_harbour():
    """Boats on straight legs, converted measurements, two-point start; the whole radar chain.

    The two-point start is Bar-Shalom et al. 2001, sec. 5.5.3; coordinates are filtered apart, so
    the covariance of x and y is left out and each axis judged on its own.
    """
    sequence = simulate(
        "harbour",
        seed=3,
        settings=settings(
            "harbour",
            "approach.straight_seconds=1e9",
            "approach.speed_relaxation_seconds=1e9",
            "approach.arrivals_per_minute=12",
            "detection.probability=1",
            "detection.size_half=0",
            "radar.clutter_per_scan=0",
            "clock.seconds=100",
        ),
    )
    found, objects = sequence.detections, sequence.objects
    scans = len(sequence.frames)
    seen = np.bincount(found.origin)
    whole = np.flatnonzero(seen == scans)
    assert len(whole) > 40
    of_whole = np.isin(found.origin, whole)
    order = np.lexsort((found.origin[of_whole], found.frame[of_whole]))
    z = sequence.log().z[of_whole][order].reshape(scans, -1, 2)
    r = (found.sigma[of_whole][order] ** 2).reshape(scans, -1, 2)
    last = np.isin(objects.object, whole) & (objects.frame == scans - 1)
    dt, q = 2.0, sequence.settings.approach.acceleration_noise
    for axis in (0, 1):
        r0, r1 = r[0, :, axis], r[1, :, axis]
        mean = np.column_stack((z[1, :, axis], (z[1, :, axis] - z[0, :, axis]) / dt))
        covariance = np.array([[r1, r1 / dt], [r1 / dt, (r0 + r1) / dt**2 + q**2 * dt / 3]])
        mean, covariance, nis = textbook_filter(
            z[2:, :, axis], r[2:, :, axis], dt, q, mean, covariance.transpose(2, 0, 1)
        )
        true = np.column_stack((objects.xy[last, axis], objects.velocity[last, axis]))
        low, high = bounds(len(whole), 2)
        assert low < nees(mean, covariance, true).mean() < high
        low, high = bounds(nis.size, 1)
        assert low < nis.mean() < high


def test_boats_turn_as_their_kind_can():
    sequence = simulate(
        "harbour",
        seed=2,
        settings=settings(
            "harbour", "approach.acceleration_noise=0", "approach.turn_seconds=1e9",
            "approach.straight_seconds=5", "clock.frame_rate_hz=2", "clock.seconds=60",
        ),
    )  # fmt: skip
    objects = sequence.objects
    kinds = [getattr(sequence.settings.approach, name) for name in sequence.labels]
    for number in np.unique(objects.object):
        rows = objects.object == number
        velocity = objects.velocity[rows]
        if len(velocity) < 20:
            continue
        heading = np.unwrap(np.arctan2(velocity[:, 1], velocity[:, 0]))
        rate = np.degrees(np.diff(heading)) * 2.0
        limit = kinds[objects.label[rows][0]].turn_rate_degrees
        assert np.abs(rate).max() < 1.001 * limit
        assert np.abs(rate[-1]) > 0.399 * limit  # every boat is in a turn by now


def test_vehicles_roll_along_their_heading_stop_and_reverse():
    sequence = simulate("yard", seed=4)
    objects = sequence.objects
    heading = objects.shape[:, 2]
    ahead = objects.velocity[:, 0] * np.cos(heading) + objects.velocity[:, 1] * np.sin(heading)
    aside = objects.velocity[:, 1] * np.cos(heading) - objects.velocity[:, 0] * np.sin(heading)
    assert np.abs(aside).max() < 0.05  # interpolation within a step and rounding of the heading
    assert np.mean(ahead < -0.3) > 0.005
    assert np.mean(np.abs(ahead) < 0.05) > 0.05
    fleet = sequence.settings.fleet
    assert ahead.max() < 1.5 * max(fleet.carrier.speed, fleet.forklift.speed)


def test_positions_agree_with_velocities():
    """Central differences of the positions, at 25 Hz, against the velocities."""
    for scene, tolerance in (("forecourt", 0.15), ("yard", 0.15)):
        sequence = simulate(
            scene, seed=2, settings=settings(scene, "clock.frame_rate_hz=25", "clock.seconds=4")
        )
        objects = sequence.objects
        for number in np.unique(objects.object):
            rows = np.flatnonzero(objects.object == number)
            if len(rows) < 3 or np.any(np.diff(objects.frame[rows]) != 1):
                continue
            slope = (objects.xy[rows[2:]] - objects.xy[rows[:-2]]) * 12.5
            assert np.abs(slope - objects.velocity[rows[1:-1]]).max() < tolerance


def test_walkers_fluctuate_as_langevin_walkers():
    """Across the way to the goal the velocity has the variance q² tau / 2 (fluctuation theorem)."""
    chosen = settings(
        "forecourt", "traffic.push=0", "traffic.pauses_per_minute=0", "traffic.stops_mean=0",
        "traffic.group_share=0", "traffic.cart_share=0", "traffic.bicycle_share=0",
        "traffic.arrivals_per_minute=120",
    )  # fmt: skip
    movement = walk(chosen.site, chosen.traffic, np.arange(0, 40, 0.5), Streams(3))
    across = []
    for walker in np.unique(movement.object):
        rows = movement.object == walker
        if rows.sum() < 8:
            continue
        way = movement.xy[rows][-1] - movement.xy[rows][0]
        way = way / np.hypot(*way)
        velocity = movement.velocity[rows][:-6]  # near the door the way bends
        across.append(velocity[:, 1] * way[0] - velocity[:, 0] * way[1])
    found = np.std(np.concatenate(across))
    # The way itself is known to a few degrees (1.35 m/s x 0.03 rad): 15% tolerance.
    assert found == pytest.approx(0.25 * np.sqrt(0.6 / 2), rel=0.15)


def test_people_keep_apart_and_out_of_obstacles():
    sequence = simulate("rush", seed=1)
    objects = sequence.objects
    close = 0
    for k in range(0, len(sequence.frames), 10):
        xy = objects.xy[objects.frame == k]
        gap = np.hypot(*(xy[:, None] - xy[None]).transpose(2, 0, 1))
        close += np.sum(gap[np.triu_indices(len(xy), 1)] < 0.3)
    # Common practice, no source: less than one person in a hundred is in another's place.
    assert close < 0.01 * len(objects) / 10
    for item in sequence.settings.site.obstacles:
        inside = np.abs(objects.xy - [item.x_m, item.y_m]) < [item.width_m / 2, item.depth_m / 2]
        assert not np.any(inside.all(axis=1))


def test_people_walk_at_walking_speed_and_bicycles_faster():
    """Free walking speed is about 1.34 m/s (Weidmann 1993, from memory)."""
    sequence = simulate("forecourt", seed=2, settings=settings("forecourt", "clock.seconds=60"))
    objects = sequence.objects
    speed = np.hypot(*objects.velocity.T)
    person = objects.label == LABELS.index("person")
    bicycle = objects.label == LABELS.index("bicycle")
    assert np.median(speed[person]) == pytest.approx(1.34, abs=0.2)
    assert np.median(speed[bicycle]) > 2.0
    assert 0.03 < np.mean(speed[person] < 0.2) < 0.4  # some stand
