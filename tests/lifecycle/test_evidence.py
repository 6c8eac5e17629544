"""Wald's sequential test: its thresholds, and its error rates by simulation."""

import math

import numpy as np
import pytest

from tracker import Engine, Frame, load_settings
from tracker.lifecycle.evidence import evidence_test
from tracker.lifecycle.rules import Reason
from tracker.results.tracks import TrackState
from tracker.settings.schema import LifecycleSettings

SIDE = 100.0  # of a square plane, in metres
CLUTTER = 8.0  # false detections a frame
DETECTED = 0.8
SIGMA = 0.5


def settings(alpha, beta):
    return load_settings(
        None,
        (
            "lifecycle.rule=evidence",
            f"lifecycle.false_confirm_probability={alpha}",
            f"lifecycle.false_drop_probability={beta}",
            "lifecycle.undecided_frames=1000",
            "lifecycle.coast_seconds=1000",
            f"cost.new_density={CLUTTER / SIDE**2}",
            f"sensor.detection_probability={DETECTED}",
            f"measurement.position_sigma={SIGMA}",
            "motion.acceleration_noise=0.1",
            "motion.initial_speed_sigma=1.0",
        ),
    )


def outcomes(seed, alpha, beta, objects, clutter, frames=60):
    """(confirmed, dropped) tentative tracks of a plane with these objects and this clutter."""
    rng = np.random.default_rng(seed)
    engine = Engine(settings(alpha, beta), "point", explain=False)
    place = rng.uniform(10.0, SIDE - 10.0, (objects, 2))
    speed = rng.normal(0.0, 1.0, (objects, 2))
    confirmed = dropped = 0
    for k in range(frames):
        place += 0.1 * speed
        seen = place[rng.random(objects) < (DETECTED if k else 1.0)]
        seen = seen + rng.normal(0.0, SIGMA, seen.shape)
        false = rng.uniform(0.0, SIDE, (rng.poisson(clutter), 2))
        result = engine.step(Frame.of_points(k + 1, 0.1 * k, np.concatenate((seen, false))))
        events = result.transitions
        confirmed += int(np.sum(events.reason == Reason.EVIDENCE_REACHED))
        tentative = events.before == TrackState.TENTATIVE
        dropped += int(np.sum((events.reason == Reason.EVIDENCE_GONE) & tentative))
    return confirmed, dropped


def test_thresholds_are_walds():
    """ln ((1 - beta) / alpha) and ln (beta / (1 - alpha)); Wald 1947, (3:25) from memory."""
    test = evidence_test(LifecycleSettings(false_confirm_probability=0.001, real_share=0.2))
    assert test.confirm_at == pytest.approx(math.log(0.99 / 0.001))
    assert test.drop_at == pytest.approx(math.log(0.01 / 0.999))
    assert test.start == pytest.approx(math.log(0.25))


@pytest.mark.parametrize("alpha", [0.1, 0.02])
def test_clutter_is_confirmed_no_more_often_than_asked(alpha):
    """Wald's bound: at most alpha / (1 - beta) of the tests of clutter. Binomial, 4 sigma."""
    runs = [outcomes(seed, alpha, 0.05, 0, CLUTTER) for seed in range(12)]
    confirmed, dropped = np.sum(runs, axis=0)
    total = confirmed + dropped
    assert total > 3000
    bound = alpha / 0.95
    assert confirmed / total <= bound + 4.0 * math.sqrt(bound * (1 - bound) / total)
    assert confirmed > 0, "else the test says nothing"


@pytest.mark.parametrize("beta", [0.2, 0.05])
def test_objects_are_dropped_no_more_often_than_asked(beta):
    """At most beta / (1 - alpha) of the tests of objects that are there. Binomial, 4 sigma; each
    run begins a test of each of 30 objects, and another one after a drop."""
    runs = [outcomes(100 + seed, 0.02, beta, 30, 0.0) for seed in range(12)]
    confirmed, dropped = np.sum(runs, axis=0)
    total = confirmed + dropped
    bound = beta / 0.98
    assert total >= 360
    assert dropped / total <= bound + 4.0 * math.sqrt(bound * (1 - bound) / total)


def test_a_confirmed_track_ends_once_the_evidence_is_used_up():
    """P_D 0.8: each miss takes ln(1 - 0.8 x 0.999) = 1.6 nats; from +4.55 at most to -4.55."""
    engine = Engine(settings(0.01, 0.01), "point")
    frame = 0
    for frame in range(20):
        result = engine.step(Frame.of_points(frame + 1, 0.1 * frame, [[0.1 * frame, 0.0]]))
    assert result.state.tolist() == [TrackState.CONFIRMED]
    misses = 0
    while len(result.track):
        frame += 1
        misses += 1
        result = engine.step(Frame.of_points(frame + 1, 0.1 * frame, np.empty((0, 2))))
    need = (math.log(0.99 / 0.01) - math.log(0.01 / 0.99)) / -math.log(1.0 - 0.8 * 0.999)
    assert misses == math.ceil(need)
    assert result.transitions.reason.tolist() == [Reason.EVIDENCE_GONE]


def test_what_stays_undecided_ends():
    engine = Engine(
        load_settings(
            None,
            ("lifecycle.rule=evidence", "lifecycle.undecided_frames=4", "cost.new_density=1.5",
             "measurement.position_sigma=0.3", "motion.acceleration_noise=0.5"),
        ),
        "point",
    )  # fmt: skip
    reasons = []
    for k in range(5):
        result = engine.step(Frame.of_points(k + 1, 0.1 * k, [[0.0, 0.0]]))
        reasons += result.transitions.reason.tolist()
    assert Reason.UNDECIDED in reasons
