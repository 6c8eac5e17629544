"""The engine in joint-probabilistic mode."""

from dataclasses import replace

import numpy as np
import pytest

from tests.reference.joint_update import probabilistic_data_association
from tracker import Engine, Frame
from tracker.errors import SettingsError
from tracker.settings import Settings, load_settings, settings_as_toml, settings_from

POINTS = {
    "association": {"mode": "joint-probabilistic"},
    "sensor": {"detection_probability": 0.95},
    "motion": {"acceleration_noise": 0.3, "initial_speed_sigma": 3.0},
    "measurement": {"position_sigma": 0.3},
    "cost": {"terms": ["likelihood"], "new_density": 0.01},
    "lifecycle": {"coast_seconds": 1.0},
}


def joint(**sections):
    return settings_from(POINTS | sections)


def best(**sections):
    return joint(association={"mode": "best"}, **sections)


def crossing(seconds=8.0, rate=10.0):
    """Two points whose straight paths cross half way."""
    for k in range(int(seconds * rate) + 1):
        t = k / rate
        x = 2.0 * (t - 0.5 * seconds)
        yield Frame.of_points(k + 1, t, [[x, 0.5 * x], [x, -0.5 * x]])


def test_at_a_crossing_either_pairing_is_as_probable_as_the_other():
    engine = Engine(joint(), "point")
    own = []
    for frame in crossing():
        result = engine.step(frame)
        tier = result.tiers[0]
        probability = dict.fromkeys(((i, j) for i in (0, 1) for j in (0, 1)), 0.0)
        if len(result.considered):
            row = np.repeat((0, 1), np.diff(tier.problem.start))
            keys = zip(row, tier.problem.column, strict=True)
            probability |= dict(zip(keys, result.marginals[0].pair, strict=True))
            own.append(probability[0, 0])
            total = result.marginals[0].miss[0] + probability[0, 0] + probability[0, 1]
            assert total == pytest.approx(1.0, abs=1e-12)
    meet = len(own) // 2 - 1
    assert own[meet] == pytest.approx(0.5, abs=0.01)
    assert own[meet - 1 : meet + 2] == pytest.approx([0.5, 0.5, 0.5], abs=0.15)
    assert min(own[:20] + own[-20:]) > 0.99
    assert result.track.tolist() == [1, 2]
    assert result.estimate == pytest.approx(frame.z, abs=0.3)


def test_a_single_track_and_detection_equal_the_textbook():
    """β = P_D N(ν; S) / λ against 1 − P_D P_G (Bar-Shalom, Li 1995, sec. 3.4; from memory)."""
    engine = Engine(joint(), "point")
    engine.step(Frame.of_points(1, 0.0, [[0.0, 0.0]]))
    watch = Engine(joint(), "point")
    watch.step(Frame.of_points(1, 0.0, [[0.0, 0.0]]))
    watch.motion.predict(watch.table.mean, watch.table.covariance, 0.1)
    x, p = watch.table.mean[0], watch.table.covariance[0]
    z = np.array([[0.4, -0.9]])
    result = engine.step(Frame.of_points(2, 0.1, z))
    r = 0.09 * np.eye(2)
    s = p[:2, :2] + r
    innovation = z[0] - x[:2]
    density = np.exp(-0.5 * innovation @ np.linalg.inv(s) @ innovation)
    density /= 2.0 * np.pi * np.sqrt(np.linalg.det(s))
    odds = 0.95 * density / 0.01
    beta = odds / (odds + 1.0 - 0.95 * 0.999)
    assert result.marginals[0].pair == pytest.approx([beta], rel=1e-9)
    mean, covariance = probabilistic_data_association(x, p, z, r, np.array([beta]))
    np.testing.assert_allclose(engine.table.mean[0], mean, rtol=0, atol=1e-12)
    np.testing.assert_allclose(engine.table.covariance[0], covariance, rtol=0, atol=1e-12)


def test_without_ambiguity_it_is_the_ordinary_filter():
    """P_D next to 1 and one detection in each gate: β is 1 up to 1e-9."""
    sure = {
        "sensor": {"detection_probability": 1.0 - 1e-12},
        "gate": {"probability": 1.0 - 1e-12},
    }
    engines = [Engine(joint(**sure), "point"), Engine(best(**sure), "point")]
    rng = np.random.default_rng(1)
    for k in range(40):
        t = k / 10
        place = np.array([[t, 0.0], [50.0 - t, 3.0 * t], [0.0, 90.0]]) + rng.normal(0, 0.3, (3, 2))
        one, other = (engine.step(Frame.of_points(k + 1, t, place)) for engine in engines)
        assert one.track.tolist() == other.track.tolist() == [1, 2, 3]
        np.testing.assert_allclose(one.estimate, other.estimate, rtol=0, atol=1e-7)
        np.testing.assert_allclose(one.covariance, other.covariance, rtol=0, atol=1e-7)
    assert other.marginals == ()


def cluttered(seed, frames=40, clutter=12):
    """One point at constant velocity among false ones, all in a square of 20."""
    rng = np.random.default_rng(seed)
    for k in range(frames):
        t = k / 10
        here = np.array([2.0 + 3.0 * t, 10.0 + 0.5 * t])
        z = [here + rng.normal(0, 0.3, 2)] if k == 0 or rng.random() < 0.95 else []
        if k:
            z = [*rng.uniform(0, 20, (clutter, 2)), *z]
        yield here, Frame.of_points(k + 1, t, z)


def test_fewer_tracks_are_lost_in_clutter():
    """What the method was made for (Bar-Shalom and Tse 1975); lost: over 3 off at the end."""
    lost = {"joint-probabilistic": 0, "best": 0}
    for seed in range(60):
        for name in lost:
            settings = joint(
                association={"mode": name},
                cost={"terms": ["likelihood"], "new_density": 12 / 400},
                lifecycle={"birth_score": 0.5},
            )
            engine = Engine(settings, "point")
            for here, frame in cluttered(seed):
                score = np.full(len(frame), 0.9 if frame.number == 1 else 0.1)
                result = engine.step(replace(frame, score=score))
                goal = here
            near = len(result) and np.hypot(*(result.estimate[0] - here)) < 3.0
            lost[name] += not near
    assert lost["joint-probabilistic"] < lost["best"]
