"""What is resampled: clocks and blocks of time."""

from __future__ import annotations

import numpy as np
import pytest

from tests.evaluation.made import make_tracks, make_truth, random_scene, standing
from tracker.comparison.blocks import Clock, clock_of, sum_blocks
from tracker.comparison.parts import COLUMNS, frame_parts
from tracker.comparison.rows import truth_rows
from tracker.evaluation.evaluate import examine
from tracker.log import SequenceFacts


def ones(count):
    return np.ones((count, COLUMNS))


def test_a_clock_between_and_beyond_known_frames():
    clock = Clock(np.array([10.0, 20.0, 30.0]), np.array([1.0, 2.0, 4.0]))
    found = clock.at(np.array([0, 10, 15, 25, 30, 40]))
    # Beyond, the mean step of the whole: 3 s in 20 frames.
    np.testing.assert_allclose(found, [-0.5, 1.0, 1.5, 3.0, 4.0, 5.5], rtol=1e-12)


def test_a_clock_that_knows_one_frame_or_none():
    one, none = Clock(np.array([5.0]), np.array([2.0])), Clock(np.zeros(0), np.zeros(0))
    assert one.at(np.array([5, 30])).tolist() == [2.0, 3.0]  # 25 Hz is assumed
    assert none.at(np.array([0, 50])).tolist() == [0.0, 2.0]


FRAMES = [1, 2, 3, 4]
SLOW = SequenceFacts(frame_rate_hz=2.0)


@pytest.mark.parametrize(
    ("truth", "tracks", "wanted"),
    [
        ({"time": np.array([7.0, 8.0, 9.0, 10.0])}, {"facts": SLOW}, [7.0, 8.0, 9.0, 10.0]),
        ({"facts": SLOW}, {}, [0.5, 1.0, 1.5, 2.0]),
        ({}, {}, [0.1, 0.2, 0.3, 0.4]),  # the tracks' own times, frame / 10
    ],
)
def test_whose_clock_it_is(truth, tracks, wanted):
    made = make_truth(standing(FRAMES, 7), **truth)
    own = make_tracks(standing(FRAMES, 1), **tracks)
    found = examine(own, made)
    clock = clock_of(found, made, (own, own))
    np.testing.assert_allclose(clock.at(np.array(FRAMES)), wanted, rtol=1e-12)


def test_tracks_with_a_known_rate_come_before_those_with_an_assumed_one():
    truth = make_truth(standing(FRAMES, 7))
    guessed = make_tracks(standing(FRAMES, 1))
    known = make_tracks(standing(FRAMES, 1), facts=SLOW, time=np.array(FRAMES) / 2.0)
    for pair in ((guessed, known), (known, guessed)):
        clock = clock_of(examine(pair[0], truth), truth, pair)
        assert clock.at(np.array([4]))[0] == 2.0


def test_frames_fall_into_blocks_of_both_runs_together():
    seconds = [np.array([0.0, 0.9, 1.0, 5.2]), np.array([0.5, 2.0])]
    a, b = sum_blocks(seconds, [ones(4), ones(2)], 1.0)
    # Blocks 0, 1, 2 and 5; the others have no frame in either run.
    assert a[:, 0].tolist() == [2, 1, 0, 1]
    assert b[:, 0].tolist() == [1, 0, 1, 0]


def test_steps_that_are_not_exact_in_binary():
    seconds = np.arange(1, 41) * 0.1
    a, _ = sum_blocks([seconds, seconds], [ones(40), ones(40)], 1.0)
    assert a[:, 0].tolist() == [10, 10, 10, 10]


def test_a_run_without_a_frame():
    a, b = sum_blocks([np.zeros(0), np.array([3.0, 4.0])], [ones(0), ones(2)], 1.0)
    assert (a[:, 0].tolist(), b[:, 0].tolist()) == ([0, 0], [1, 1])
    a, b = sum_blocks([np.zeros(0), np.zeros(0)], [ones(0), ones(0)], 1.0)
    assert a.shape == b.shape == (0, COLUMNS)


@pytest.mark.parametrize("block_seconds", [0.1, 0.7, 100.0])
def test_blocks_add_up_to_the_sequence(block_seconds):
    tracks, truth = random_scene(3)
    found = examine(tracks, truth)
    parts = frame_parts(found, truth_rows(found))
    seconds = clock_of(found, truth, (tracks,)).at(found.both.numbers)
    a, b = sum_blocks([seconds, seconds], [parts, parts], block_seconds)
    np.testing.assert_array_equal(a, b)
    assert len(a) == {0.1: 30, 0.7: 5, 100.0: 1}[block_seconds]
    np.testing.assert_array_equal(a[:, :12].sum(axis=0), parts[:, :12].sum(axis=0))
    np.testing.assert_allclose(a.sum(axis=0), parts.sum(axis=0), rtol=1e-12)
