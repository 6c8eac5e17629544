"""The per-frame loop: identity, lifecycle, time, and what must not matter."""

import doctest
from dataclasses import replace

import numpy as np
import pytest

import tracker.engine
from tracker import Engine, Frame, Kind, Settings, load_settings
from tracker.errors import InputError, SettingsError, UsageError
from tracker.lifecycle.rules import Reason
from tracker.log.model import Frame as FrameOfArrays
from tracker.results import TrackState


def points(*xy, number=1, time=0.0, score=None):
    return Frame.of_points(number, time, np.array(xy, float).reshape(-1, 2), score)


def walk(engine, paths, step=0.1, hidden=()):
    """Feed straight walks: paths are (x, y, vx, vy); hidden are (frame, walker) not detected."""
    results = []
    for k in range(60):
        seen = [
            (x + vx * k * step, y + vy * k * step)
            for n, (x, y, vx, vy) in enumerate(paths)
            if (k, n) not in hidden
        ]
        results.append(engine.step(points(*seen, number=k + 1, time=k * step)))
    return results


POINTS = load_settings(
    None,
    (
        "measurement.position_sigma=0.1",
        "motion.acceleration_noise=0.5",
        "motion.initial_speed_sigma=3",
    ),
)


def test_the_example_in_the_docstring_runs():
    names = {"Frame": Frame, "Kind": Kind, "Settings": Settings}
    failed, tried = doctest.testmod(tracker.engine, extraglobs=names)
    assert (failed, tried > 0) == (0, True)


def test_crossing_walkers_keep_their_identities():
    results = walk(Engine(POINTS, "point"), [(0, 0, 1, 1), (0, 6, 1, -1)])
    first, last = results[5], results[-1]
    assert last.track.tolist() == [1, 2]
    assert first.estimate[0, 1] < first.estimate[1, 1]
    assert last.estimate[0, 1] > last.estimate[1, 1]  # they have crossed


def test_ids_are_never_reused_and_grow():
    engine = Engine(POINTS, "point")
    seen = []
    for k in range(30):
        result = engine.step(points((50.0 * k, 0.0), number=k + 1, time=10.0 * k))
        seen += [int(track) for track in result.track if track not in seen]
    assert seen == list(range(1, 31))


def test_confirmation_needs_m_detections_in_n_frames():
    settings = load_settings(None, ("lifecycle.confirm_hits=3", "lifecycle.confirm_window=4"))
    engine = Engine(settings, "point")
    states = []
    for k, here in enumerate([1, 1, 0, 1, 1]):
        result = engine.step(points(*([(0, 0)] if here else []), number=k + 1, time=0.1 * k))
        states.append([TrackState(state).word for state in result.state])
    assert states == [["tentative"], ["tentative"], ["tentative"], ["confirmed"], ["confirmed"]]


def test_a_track_that_cannot_be_confirmed_any_more_ends_at_once():
    engine = Engine(Settings(), "point")  # 2 of 3
    engine.step(points((0, 0)))
    engine.step(points(number=2, time=0.1))
    result = engine.step(points(number=3, time=0.2))
    assert len(result) == 0
    assert [Reason(code) for code in result.transitions.reason] == [Reason.HITS_OUT_OF_REACH]


@pytest.mark.parametrize(("gap", "survives"), [(1.0, True), (2.0, True), (2.001, False)])
def test_coasting_is_limited_in_seconds_whatever_the_frames(gap, survives):
    engine = Engine(Settings(), "point")  # 2 s
    for k in range(4):
        engine.step(points((0, 0), number=k + 1, time=0.1 * k))
    result = engine.step(points((0, 0), number=50, time=0.3 + gap))
    assert (result.track.tolist() == [1]) == survives


def test_prediction_uses_the_real_time_step():
    engine = Engine(POINTS, "point")
    times = [0.0, 0.1, 0.2, 0.5, 0.6, 1.1, 1.15, 1.2]
    for k, time in enumerate(times):
        result = engine.step(points((3.0 * time, 0.0), number=k + 1, time=time))
    assert result.track.tolist() == [1]
    np.testing.assert_allclose(result.rate[0], [3.0, 0.0], atol=0.3)


def test_frames_out_of_order_are_refused():
    engine = Engine(Settings(), "point")
    engine.step(points((0, 0), time=1.0))
    with pytest.raises(UsageError, match="does not come after"):
        engine.step(points((0, 0), number=2, time=1.0))


def test_births_need_the_birth_score_and_a_missing_score_does_not_hinder():
    engine = Engine(load_settings(None, ("lifecycle.birth_score=0.5",)), "point")
    result = engine.step(points((0, 0), (5, 5), (9, 9), score=[0.4, 0.5, np.nan]))
    assert result.detection.tolist() == [1, 2]


@pytest.mark.parametrize("kind", ["box", "point"])
def test_empty_frames_from_the_first_on(kind):
    engine = Engine(Settings(), kind)
    width = Kind(kind).dimension
    for k in range(3):
        frame = FrameOfArrays(
            k, 0.1 * k, np.empty((0, width)), np.empty(0), np.empty(0, np.int32), np.empty(0, int)
        )
        result = engine.step(frame)
        assert (len(result), len(result.transitions.track)) == (0, 0)


def test_a_precise_detection_pulls_harder():
    moved = {}
    for sigma in (0.01, 2.0):
        engine = Engine(POINTS, "point")
        for k in range(5):
            engine.step(points((0, 0), number=k + 1, time=0.1 * k))
        frame = points((0.15, 0), number=6, time=0.5)
        exact = replace(frame, sigma=np.full((1, 2), sigma))
        moved[sigma] = engine.step(exact).estimate[0, 0]
    assert moved[0.01] > 0.14 > 0.02 > moved[2.0]


def crowd(seed, frames=25, count=40):
    """Boxes in a crowd, some missed; every frame in a given order."""
    rng = np.random.default_rng(seed)
    place = rng.uniform(0, 500, (count, 2))
    speed = rng.normal(0, 25, (count, 2))
    size = rng.uniform(20, 40, (count, 2))
    for k in range(frames):
        seen = rng.random(count) < 0.9
        corner = place + speed * k / 25 + rng.normal(0, 1, (count, 2))
        yield k, np.column_stack((corner, size))[seen]


def decided(settings=None, order=None, scale=1.0, explain=True):
    """(track, place) of every frame of the crowd."""
    engine = Engine(settings or Settings(), explain=explain)
    out = []
    for k, corners in crowd(3):
        if order is not None:
            corners = corners[np.random.default_rng((order, k)).permutation(len(corners))]
        result = engine.step(Frame.of_boxes(k + 1, k / 25, scale * corners))
        out.append((result.track, np.round(result.estimate / scale, 6), result.state))
    return out


def test_explaining_does_not_change_decisions():
    for one, other in zip(decided(), decided(explain=False), strict=True):
        assert all((a == b).all() for a, b in zip(one, other, strict=True))


def test_order_within_a_frame_does_not_matter():
    """Ids may differ, since births are numbered in order; who is whom may not."""
    plain, shuffled = decided(), decided(order=1)
    name = {}
    for one, other in zip(plain, shuffled, strict=True):
        key = {tuple(place): int(track) for track, place in zip(one[0], one[1], strict=True)}
        assert len(one[0]) == len(other[0])
        for track, place in zip(other[0], other[1], strict=True):
            assert name.setdefault(int(track), key[tuple(place)]) == key[tuple(place)]


def test_boxes_are_treated_alike_at_any_scale():
    for one, other in zip(decided(), decided(scale=8.0), strict=True):
        assert one[0].tolist() == other[0].tolist()
        np.testing.assert_allclose(one[1], other[1], rtol=1e-6, atol=1e-5)


def test_a_frame_of_fifty_thousand_boxes():
    rng = np.random.default_rng(4)
    corners = np.column_stack((rng.uniform(0, 15_000, (50_000, 2)), np.full((50_000, 2), 20.0)))
    engine = Engine(Settings(), explain=False)
    engine.step(Frame.of_boxes(1, 0.0, corners))
    result = engine.step(Frame.of_boxes(2, 0.04, corners + np.array([0.5, 0, 0, 0])))
    assert len(result) >= 50_000
    assert (result.detection >= 0).sum() >= 50_000


def test_a_heap_of_boxes_stops_at_the_candidate_limit():
    rng = np.random.default_rng(5)
    corners = np.column_stack((rng.uniform(0, 30, (3_000, 2)), np.full((3_000, 2), 40.0)))
    engine = Engine(load_settings(None, ("gate.candidate_limit=100000",)))
    engine.step(Frame.of_boxes(1, 0.0, corners))
    with pytest.raises(InputError, match=r"frame 2 has more than 100000 candidate pairs.*Narrow"):
        engine.step(Frame.of_boxes(2, 0.04, corners))


def test_tiers_take_weak_detections_only_to_keep_tracks():
    settings = load_settings(
        None,
        (
            "tiers=[{name='confident', score_from=0.6}, "
            "{name='weak', score_below=0.6, states=['confirmed', 'coasting']}]",
            "lifecycle.birth_score=0.6",
        ),
    )
    engine = Engine(settings, "point")
    for k in range(3):
        engine.step(points((0, 0), number=k + 1, time=0.1 * k, score=[0.9]))
    result = engine.step(points((0, 0), (9, 9), number=4, time=0.3, score=[0.3, 0.3]))
    assert result.track.tolist() == [1]  # kept alive by a weak one; the other weak one starts none
    assert result.detection.tolist() == [0]
    assert [tier.rule.name for tier in result.tiers] == ["confident", "weak"]
    assert result.tiers[1].detection.tolist() == [0, 1]


def test_a_detection_goes_to_one_tier_and_one_track():
    settings = load_settings(
        None,
        (
            "tiers=[{name='established', states=['confirmed', 'coasting']}, "
            "{name='tentative', states=['tentative']}]",
        ),
    )
    for track, _, _ in decided(settings):
        assert len(set(track.tolist())) == len(track)
    engine = Engine(settings)
    for k, corners in crowd(3):
        result = engine.step(Frame.of_boxes(k + 1, k / 25, corners))
        used = result.detection[result.detection >= 0].tolist()
        assert len(used) == len(set(used))


@pytest.mark.parametrize(
    ("kind", "override", "words"),
    [
        ("point", "gate.overlap_floor=0.1", "gate.overlap_floor: an overlap floor needs boxes"),
        ("point", "cost.terms=['overlap']", "cost.terms: 'overlap' needs boxes"),
        ("point", "gate.probability=none", "gate.probability: there is no gate at all"),
        ("point", "cost.terms=['likelihood']", "cost.new_density: 'likelihood' needs the density"),
        ("box", "cost.terms=['colour']", "there is no cost term 'colour'; there are auto, overlap"),
    ],
)
def test_settings_that_contradict_each_other(kind, override, words):
    with pytest.raises(SettingsError) as caught:
        Engine(load_settings(None, (override,)), kind)
    assert words in str(caught.value)


def test_mahalanobis_without_gate_is_refused():
    settings = load_settings(
        None, ("cost.terms=['mahalanobis']", "gate.probability=none", "gate.overlap_floor=0.2")
    )
    with pytest.raises(SettingsError, match="measured against the d² gate"):
        Engine(settings)


def test_appearance_tells_twins_apart():
    """Two objects at one place, told apart by their embeddings alone."""
    settings = load_settings(
        None, ("cost.terms=['mahalanobis', 'appearance']", "measurement.position_sigma=1.0")
    )
    engine = Engine(settings, "point")
    faces = np.eye(2, dtype=np.float32)
    for k in range(12):
        order = [0, 1] if k % 2 else [1, 0]
        frame = points((0, 0), (0.1, 0), number=k + 1, time=0.1 * k)
        result = engine.step(
            FrameOfArrays(
                k + 1,
                0.1 * k,
                frame.z,
                frame.score,
                frame.label,
                frame.line,
                embedding=faces[order],
            )
        )
    held = {
        int(track): order[det] for track, det in zip(result.track, result.detection, strict=True)
    }
    assert len(held) == 2
    first = engine.table.embedding
    np.testing.assert_allclose(np.abs(first).max(axis=1), 1.0, atol=1e-5)  # never mixed
    with pytest.raises(InputError, match="needs embeddings"):
        engine.step(points((0, 0), number=99, time=9.0))


def test_registered_costs_are_checked():
    from tracker import register_cost

    with pytest.raises(UsageError, match="built-in"):
        register_cost("overlap", lambda pairs: pairs.overlap)
    register_cost("too short", lambda pairs: pairs.overlap[:-1])
    engine = Engine(load_settings(None, ("cost.terms=['mahalanobis', 'too short']",)), "point")
    engine.step(points((0, 0)))
    with pytest.raises(UsageError, match="'too short' must return 1 finite numbers"):
        engine.step(points((0, 0), number=2, time=0.1))


def test_frames_from_outside_are_checked():
    with pytest.raises(UsageError, match="not finite"):
        Frame.of_points(1, 0.0, [[np.nan, 1.0]])
    with pytest.raises(UsageError, match="above 0"):
        Frame.of_boxes(1, 0.0, [[0, 0, -1, 5]])
