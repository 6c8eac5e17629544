"""Whole comparisons: equal runs, a planted difference, seeds, what is refused."""

from __future__ import annotations

import json
from dataclasses import replace

import numpy as np
import pytest

from tests.evaluation.made import make_tracks, make_truth, random_scene, standing
from tracker import compare
from tracker.comparison import COMPARED, LOWER_BETTER
from tracker.comparison.blocks import ENOUGH_SEQUENCES
from tracker.errors import UsageError
from tracker.evaluation import Scope, evaluate_all
from tracker.evaluation.scores import LIMITED
from tracker.log import Kind
from tracker.offline import track_log
from tracker.settings import load_settings
from tracker.simulation import SCENES, simulate
from tracker.simulation.overrides import scene_settings


def several(count, **options):
    found = {}
    for seed in range(count):
        tracks, truth = random_scene(seed, **options)
        found[f"s{seed}"] = (tracks, tracks, truth)
    return found


def worse(tracks, share, seed=0):
    """Every track gets a new identity now and then."""
    rng = np.random.default_rng(seed)
    fresh = rng.random(len(tracks)) < share
    return replace(tracks, track=np.where(fresh, 10**6 + np.arange(len(tracks)), tracks.track))


@pytest.mark.parametrize("kind", list(Kind))
@pytest.mark.parametrize("count", [2, ENOUGH_SEQUENCES])
def test_equal_runs_differ_by_exactly_nothing(kind, count):
    seconds = 0.5 if count < ENOUGH_SEQUENCES else None
    scope = Scope(distance_threshold=6.0)
    found = compare(several(count, kind=kind), scope, block_seconds=seconds)
    assert found.resampling.unit == ("block" if seconds else "sequence")
    for change in found.overall.values():
        assert change.difference == 0, change.score
        if seconds and change.score in ("mostly_tracked", "mostly_lost"):
            # Belong to whole objects: blocks of time cannot tell.
            assert (change.lower, change.verdict) == (None, "unknown")
            continue
        assert (change.lower, change.upper) == (0, 0), change.score
        assert (change.b_better, change.verdict) == (0.5, "same")
    assert {item.verdict for item in found.objects} == {"same"}
    assert not any(item.changed for item in found.objects)
    assert {part.frame for part in found.partings.values()} == {None}


def test_scores_are_those_of_evaluate():
    pairs = {name: (a, worse(b, 0.1), truth) for name, (a, b, truth) in several(3).items()}
    found = compare(pairs, resamples=100)
    for side, k in (("a", 0), ("b", 1)):
        alone = evaluate_all({name: (item[k], item[2]) for name, item in pairs.items()})
        for name in COMPARED:
            assert getattr(found.overall[name], side) == alone.overall.value(name)
            for sequence, changes in found.sequences.items():
                wanted = alone.sequences[sequence].value(name)
                assert getattr(changes[name], side) == wanted


def test_every_score_has_a_direction_or_none():
    neither = {"frames", "objects", "truth_boxes", "track_boxes", "partially_tracked",
               "distance_sum"}  # fmt: skip
    assert set(COMPARED) == set(LIMITED) - neither
    assert set(LOWER_BETTER) < set(COMPARED)


def test_a_change_for_the_worse_is_found():
    pairs = {name: (a, worse(b, 0.2), truth) for name, (a, b, truth) in several(8).items()}
    found = compare(pairs)
    assert found.resampling.unit == "sequence"
    for name in ("idf1", "hota", "assa", "mota", "switches", "identity_misses"):
        change = found.overall[name]
        assert change.verdict == "worse", name
        assert change.b_better == 0.0
        assert change.lower <= change.difference <= change.upper
    # Boxes are where they were.
    for name in ("recall", "precision", "misses", "gospa", "ospa"):
        assert found.overall[name].verdict == "same", name
    back = compare({name: (b, a, truth) for name, (a, b, truth) in pairs.items()})
    for name, change in found.overall.items():
        assert back.overall[name].lower == pytest.approx(-change.upper, abs=1e-9)
        assert back.overall[name].b_better == pytest.approx(1 - change.b_better)


def test_sequences_where_there_are_enough_and_blocks_where_not():
    assert compare(several(7), resamples=100).resampling.unit == "block"
    assert compare(several(8), resamples=100).resampling.unit == "sequence"
    forced = compare(several(8), resamples=100, block_seconds=1.0).resampling
    # 30 frames at 10 Hz are three blocks of a second.
    assert (forced.unit, forced.units, forced.block_seconds) == ("block", 24, 1.0)


def test_few_units_are_said_and_too_few_have_no_interval():
    tracks, _, truth = several(1)["s0"]
    pair = {"quay": (tracks, worse(tracks, 0.2), truth)}  # three seconds
    for seconds, said in ((None, "1 blocks of 5 s cannot"), (1.0, "3 blocks of 1 s cannot")):
        found = compare(pair, resamples=100, block_seconds=seconds)
        assert found.resampling is None
        assert said in found.notes[0]
        assert "it takes 6" in found.notes[0]
        assert {change.verdict for change in found.overall.values()} == {"unknown"}
        assert found.overall["idf1"].difference < 0.0
    found = compare(pair, resamples=100, block_seconds=0.5)
    assert found.resampling.units == 6
    assert "only 6 blocks of 0.5 s" in found.notes[0]
    assert compare(several(8), resamples=100).notes == ()


def test_the_seed_decides_and_workers_do_not():
    pairs = {name: (a, worse(b, 0.1), truth) for name, (a, b, truth) in several(3).items()}
    first, again, spread, other = (
        json.dumps(
            compare(pairs, resamples=200, block_seconds=0.5, seed=seed, workers=workers).as_dict()
        )
        for seed, workers in ((1, 1), (1, 1), (1, 2), (2, 1))
    )
    assert first == again == spread
    assert first != other


def test_boxes_and_points_together():
    boxes, points = (several(1, kind=kind)["s0"] for kind in Kind)
    found = compare(
        {"boxes": boxes, "points": points}, Scope(distance_threshold=6.0), block_seconds=1.0
    )
    assert found.overall["motp"].a is None
    assert found.overall["gospa"].difference is None
    assert found.overall["idf1"].lower == 0.0


def test_nothing_to_score():
    nothing = make_tracks([])
    truth = make_truth([])
    found = compare({"empty": (nothing, nothing, truth)})
    assert found.overall["idf1"].difference is None
    assert found.objects == ()
    only_truth = make_truth(standing(range(1, 201), 7))
    tracks = make_tracks(standing(range(1, 201), 1))  # 20 seconds
    found = compare({"quay": (nothing, tracks, only_truth)}, block_seconds=2.0)
    assert (found.overall["recall"].a, found.overall["recall"].b) == (0.0, 1.0)
    assert found.overall["precision"].difference is None
    assert found.overall["recall"].lower == 1.0


def test_what_is_refused():
    pairs = several(1)
    with pytest.raises(UsageError, match="at least 100 resamples"):
        compare(pairs, resamples=1)
    with pytest.raises(UsageError, match="no truth has the class 'person'"):
        compare(pairs, Scope(classes_scored=("person",)))
    tracks, _, truth = pairs["s0"]
    points, _ = random_scene(0, kind=Kind.POINT)
    with pytest.raises(UsageError, match="the tracks are points, the truth boxes"):
        compare({"s0": (tracks, points, truth)})


def test_a_gate_that_is_too_tight_is_found():
    """Planted: the same scenes with a gate that lets 60% of an object's own detections in."""
    calm = (
        "drift.objects=24", "drift.spacing=300", "drift.life_seconds=600",
        "drift.clutter_per_object=0", "labels.error_probability=0", "clock.seconds=3",
    )  # fmt: skip
    scene = scene_settings(SCENES["scale"].settings, overrides=calm)
    fitting = ("measurement.position_sigma=0.035", "measurement.size_sigma=0.045")
    pairs = {}
    for seed in range(8):
        sequence = simulate("scale", seed=seed, settings=scene)
        runs = (
            track_log(sequence.log(), load_settings(None, (*fitting, *more)))
            for more in ((), ("gate.probability=0.6",))
        )
        pairs[f"s{seed}"] = (*runs, sequence.truth())
    found = compare(pairs, with_referee=False)
    for name in ("idf1", "switches", "mota", "hota"):
        assert found.overall[name].verdict == "worse", name
    verdicts = [item.verdict for item in found.objects]
    assert verdicts.count("worse") > 0.5 * len(verdicts)
    assert all(part.by == "line" and part.frame is not None for part in found.partings.values())
