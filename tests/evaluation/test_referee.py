"""Our counters and motmetrics, an independent implementation, count the same."""

from __future__ import annotations

from dataclasses import replace

import pytest

from tests.evaluation.made import make_tracks, make_truth, random_scene, standing
from tests.log.files import SHIPPED
from tracker.errors import InternalError, UsageError
from tracker.evaluation import Scope, clearmot, evaluate, referee
from tracker.log import Kind, read_track_file, read_truth
from tracker.offline import track_log
from tracker.simulation import simulate

# `evaluate` raises InternalError where the two differ, so each of these is a comparison of all
# sixteen counts.


@pytest.mark.parametrize("threshold", [0.3, 0.5, 0.75])
@pytest.mark.parametrize("name", ["TUD-Campus", "TUD-Stadtmitte"])
def test_shipped_sequences(name, threshold):
    tracks = read_track_file(SHIPPED / name / "test.txt")
    evaluate(tracks, read_truth(SHIPPED / name / "gt.txt"), Scope(threshold))


@pytest.mark.parametrize("scene", ["forecourt", "rush", "fog", "yard", "sway", "outage"])
def test_simulated_scenes_through_the_engine(scene):
    sequence = simulate(scene, seed=11)
    scores = evaluate(track_log(sequence.log()), sequence.truth(), Scope(distance_threshold=20.0))
    assert scores.counts.matches > 100


@pytest.mark.parametrize("kind", list(Kind))
@pytest.mark.parametrize("objects", [1, 3, 8, 25])
@pytest.mark.parametrize("seed", range(5))
def test_crowded_random_scenes(seed, objects, kind):
    tracks, truth = random_scene(seed, frames=20, objects=objects, kind=kind)
    evaluate(tracks, truth, Scope(0.3 + 0.1 * seed, 6.0 + seed))


@pytest.mark.parametrize("kind", list(Kind))
def test_ties_are_settled_as_the_referee_does(kind, monkeypatch):
    settled = []
    settle = clearmot._settle_tie
    monkeypatch.setattr(clearmot, "_settle_tie", lambda *a: settled.append(a) or settle(*a))
    for seed in range(10):
        tracks, truth = random_scene(seed, frames=15, objects=25, kind=kind, ties=True)
        evaluate(tracks, truth, Scope(0.3, 8.0))
    assert len(settled) > 10


def test_frames_too_large_for_the_referee_keep_an_answer_of_ours(monkeypatch):
    tracks, truth = random_scene(3, frames=15, objects=25, kind=Kind.POINT, ties=True)
    scope = Scope(distance_threshold=8.0)
    usual = evaluate(tracks, truth, scope, with_referee=False).counts
    monkeypatch.setattr(clearmot, "LARGEST_MATRIX", 0)
    monkeypatch.setattr(clearmot, "_settle_tie", None)
    large = evaluate(tracks, truth, scope, with_referee=False).counts
    assert abs(large.matches - usual.matches) <= 2  # ties decide who is kept later


def test_a_difference_is_an_internal_error_that_says_what(monkeypatch):
    given = referee.referee_counts
    monkeypatch.setattr(
        referee, "referee_counts", lambda scene: replace(given(scene), switches=3, misses=5)
    )
    tracks, truth = make_tracks(standing([1, 2], 1)), make_truth(standing([1, 2], 7))
    with pytest.raises(InternalError, match="switches 0 against 3, misses 0 against 5"):
        evaluate(tracks, truth)
    assert evaluate(tracks, truth, with_referee=False).counts.switches == 0


def test_too_large_for_the_referee(monkeypatch):
    monkeypatch.setattr(referee, "LARGEST_BYTES", 700)
    tracks, truth = make_tracks(standing([1, 2], 1)), make_truth(standing([1, 2], 7))
    with pytest.raises(UsageError, match=r"2 objects and tracks and 2 pairs.*--referee off"):
        evaluate(tracks, truth)
    assert evaluate(tracks, truth, with_referee=False).counts.matches == 2
