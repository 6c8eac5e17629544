"""The engine in joint-probabilistic mode."""

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


def cluttered(seed, frames=40, clutter=20):
    """One point at constant velocity among false ones, all in a square of 20; only the first
    frame has none, and only its detection scores high enough to start a track."""
    rng = np.random.default_rng(seed)
    for k in range(frames):
        here = np.array([2.0 + 0.3 * k, 10.0 + 0.05 * k])
        z = [here + rng.normal(0, 0.3, 2)] if k == 0 or rng.random() < 0.95 else []
        z += [*rng.uniform(0, 20, (clutter, 2))] if k else []
        frame = Frame.of_points(k + 1, k / 10, z, np.full(len(z), 0.1 if k else 0.9))
        yield here, frame


def test_fewer_tracks_are_lost_in_clutter():
    """What the method was made for (Bar-Shalom and Tse 1975); lost: ended, or over 3 off."""
    lost = {"joint-probabilistic": 0, "best": 0}
    for seed in range(60):
        frames = list(cluttered(seed))
        for name in lost:
            settings = joint(
                association={"mode": name},
                cost={"terms": ["likelihood"], "new_density": 20 / 400},
                lifecycle={"birth_score": 0.5, "coast_seconds": 1.5},
                motion={"acceleration_noise": 0.8, "initial_speed_sigma": 3.0},
            )
            engine = Engine(settings, "point")
            for _, frame in frames:
                result = engine.step(frame)
            off = np.hypot(*(result.estimate[0] - frames[-1][0])) if len(result) else np.inf
            lost[name] += off > 3.0
    assert lost["joint-probabilistic"] <= 1
    assert lost["best"] >= 4


def test_identity_and_births_follow_the_best_assignment():
    engine = Engine(joint(), "point")
    rng = np.random.default_rng(2)
    for k in range(30):
        result = engine.step(Frame.of_points(k + 1, k / 10, rng.uniform(0, 6, (12, 2))))
        tier = result.tiers[0]
        column = dict(zip(result.considered, tier.solution.answer.row_column, strict=True))
        for track, detection in zip(result.track, result.detection, strict=True):
            if track in column:
                assert detection == column[track]
            else:  # born of what the best assignment left unpaired
                assert tier.solution.answer.column_row[detection] < 0
        sums = np.add.reduceat(np.append(result.marginals[0].pair, 0.0), tier.problem.start[:-1])
        sums[np.diff(tier.problem.start) == 0] = 0.0
        np.testing.assert_allclose(sums + result.marginals[0].miss, 1.0, rtol=0, atol=1e-12)
        assert (result.covariance == result.covariance.transpose(0, 2, 1)).all()
        assert len(result) == 0 or np.linalg.eigvalsh(engine.table.covariance).min() > 0.0


def test_beyond_the_exact_limit_the_best_assignments_stand_for_all():
    limits = {"mode": "joint-probabilistic", "exact_limit": 2, "ranked": 20}
    engine = Engine(joint(association=limits), "point")
    rng = np.random.default_rng(4)
    left_out = []
    for k in range(10):
        result = engine.step(Frame.of_points(k + 1, k / 10, rng.uniform(0, 3, (6, 2))))
        left_out += [*result.marginals[0].left_out]
        assert np.linalg.eigvalsh(engine.table.covariance).min() > 0.0
    assert 0.0 < max(left_out) < 1.0


def test_boxes_too():
    engine = Engine(settings_from({"association": {"mode": "joint-probabilistic"}}), "box")
    for k in range(10):
        corners = [[100.0 + k, 50.0, 20.0, 40.0], [108.0 - k, 52.0, 21.0, 41.0]]
        result = engine.step(Frame.of_boxes(k + 1, k / 25, corners))
    assert result.track.tolist() == [1, 2]
    assert np.linalg.eigvalsh(engine.table.covariance).min() > 0.0
    assert np.abs(engine.table.covariance[:, 0, 1]).min() > 0.0  # axes are correlated now


def test_tracks_that_keep_close_are_drawn_together():
    """The known limit: coalescence (Blom and Bloem 2000)."""
    distance = {}
    for mode in (joint, best):
        engine = Engine(mode(), "point")
        for k in range(30):
            apart = 2.0 if k < 5 else 0.4
            result = engine.step(Frame.of_points(k + 1, k / 10, [[0.0, 0.0], [0.0, apart]]))
        distance[mode] = result.estimate[1, 1] - result.estimate[0, 1]
    assert distance[best] == pytest.approx(0.4, abs=0.1)
    assert abs(distance[joint]) < 0.5 * distance[best]


def test_two_runs_are_equal_to_the_last_bit_and_explaining_changes_nothing():
    results = []
    for explain in (True, True, False):
        engine = Engine(joint(), "point", explain=explain)
        rng = np.random.default_rng(3)
        for k in range(20):
            result = engine.step(Frame.of_points(k + 1, k / 10, rng.uniform(0, 5, (10, 2))))
        results.append(result)
    for other in results[1:]:
        assert (other.track == results[0].track).all()
        assert (other.estimate == results[0].estimate).all()
        assert (other.covariance == results[0].covariance).all()


def test_settings():
    assert Settings().association.mode == "best"
    text = settings_as_toml(Settings())
    assert 'mode = "best"' in text
    assert "needs the 'likelihood' cost" in text
    given = load_settings(overrides=("association.mode=joint-probabilistic",))
    assert given.association.mode == "joint-probabilistic"


@pytest.mark.parametrize(
    ("name", "value"),
    [
        ("mode", "nearest"),
        ("exact_limit", "0"),
        ("exact_limit", "19"),
        ("exact_limit", "1.5"),
        ("ranked", "0"),
        ("limit", "3"),
    ],
)
def test_settings_out_of_range_name_their_path(name, value):
    with pytest.raises(SettingsError, match=f"association.{name}"):
        load_settings(overrides=(f"association.{name}={value}",))
