"""Pairing over time and counting, against dictionaries and plain loops."""

from __future__ import annotations

import numpy as np
import pytest

from tests.kernels.scenes import random_scene
from tests.reference import clearmot as reference
from tracker.kernels import clearmot

OBJECTS = 4


def both(function, twin, scene, keep, first=0):
    """What kernel and twin return and leave behind."""
    out = []
    for run in (function, twin):
        partner = np.full(OBJECTS, -1, np.int64)
        match = np.full(len(scene.truth), -1, np.int64)
        stop = run(scene, keep, partner, match, first)
        out.append((stop, partner.tolist(), match.tolist()))
    return out


@pytest.mark.parametrize("keep", [True, False])
@pytest.mark.parametrize("seed", range(40))
def test_pair_over_time(seed, keep):
    scene = random_scene(seed)
    found, wanted = both(clearmot.pair_over_time, reference.pair_over_time, scene, keep)
    assert found == wanted
    assert found[0] == len(scene.truth_start) - 1


@pytest.mark.parametrize("seed", range(40))
def test_it_stops_at_a_tie_and_leaves_it_open(seed):
    scene = random_scene(seed, ties=True)
    found, wanted = both(clearmot.pair_over_time, reference.pair_over_time, scene, True)
    assert found == wanted
    frames = len(scene.truth_start) - 1
    if found[0] < frames:
        partner, match = (np.array(part) for part in found[1:])
        assert clearmot.settle_frame(scene, True, partner, match, found[0], True)
        rows = slice(scene.truth_start[found[0]], scene.truth_start[found[0] + 1])
        assert (match[rows] >= 0).sum() > (np.array(found[2])[rows] >= 0).sum()


@pytest.mark.parametrize("seed", range(20))
def test_keep_pairs(seed):
    scene = random_scene(seed, frames=1)
    rng = np.random.default_rng(seed)
    partner = rng.integers(-1, OBJECTS + 2, OBJECTS)  # two objects may claim one track
    out = []
    for run in (clearmot.keep_pairs, reference.keep_pairs):
        match = np.full(len(scene.truth), -1, np.int64)
        taken = np.zeros(len(scene.track), np.bool_)
        run(scene, partner, match, 0, taken)
        out.append((match.tolist(), taken.tolist()))
    assert out[0] == out[1]


@pytest.mark.parametrize("seed", range(40))
def test_count_lifetimes(seed):
    scene = random_scene(seed, frames=12)
    match = np.full(len(scene.truth), -1, np.int64)
    clearmot.pair_over_time(scene, True, np.full(OBJECTS, -1, np.int64), match, 0)
    found = clearmot.count_lifetimes(scene, match, OBJECTS)
    wanted = reference.count_lifetimes(scene, match, OBJECTS)
    assert [part.tolist() for part in found] == list(wanted)
