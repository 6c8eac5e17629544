"""Which frame of the truth belongs to which frame of the tracks."""

from __future__ import annotations

import numpy as np

from tests.evaluation.made import make_tracks, make_truth, random_scene, standing
from tracker.evaluation.frames import aligned_frames, side_by_side

FIVE = np.arange(1, 6)


def tracks_at(frames, times):
    return make_tracks(standing(frames, 1), time=np.array(times, np.float64))


def truth_at(frames, times):
    return make_truth(standing(frames, 7), time=np.array(times, np.float64))


def test_numbers_are_used_without_times():
    truth = make_truth(standing([3, 4], 7))
    assert aligned_frames(tracks_at(FIVE, FIVE / 10), truth).tolist() == [3, 4]


def test_numbers_are_used_where_the_times_agree_with_them():
    truth = truth_at([3, 4], [0.31, 0.39])
    assert aligned_frames(tracks_at(FIVE, FIVE / 10), truth).tolist() == [3, 4]


def test_times_are_used_where_they_contradict_the_numbers():
    # A truth with times only is numbered from 1; its first time is the tracks' third.
    tracks = tracks_at(FIVE, 100 + FIVE / 10)
    assert aligned_frames(tracks, truth_at([1, 2, 3], [100.3, 100.41, 100.48])).tolist() == [
        3, 4, 5,
    ]  # fmt: skip


def test_truth_between_the_frames_gets_frames_of_its_own():
    tracks = tracks_at([1, 2, 3, 9], [100.1, 100.2, 100.3, 100.9])
    frames = aligned_frames(tracks, truth_at([1, 2, 3], [100.3, 100.6, 100.9])).tolist()
    assert frames[0] == 3
    assert frames[2] == 9
    assert frames[1] > 9


def test_times_made_of_frame_numbers_do_not_override_them():
    # A track file without times gets frame / rate, which is one frame off a truth that starts
    # at 0 s with frame 1: the numbers are what both files say.
    tracks = tracks_at(FIVE, FIVE / 12.5)
    truth = truth_at(FIVE, (FIVE - 1) / 12.5)
    assert aligned_frames(tracks, truth).tolist() == FIVE.tolist()


def test_a_late_timestamp_does_not_unseat_the_numbers():
    times = np.array([0.0, 0.1, 0.2, 0.3, 0.4, 0.5, 0.6, 0.7, 0.8, 0.96])
    tracks = tracks_at(range(1, 11), np.arange(10) / 10)
    assert aligned_frames(tracks, truth_at(range(1, 11), times)).tolist() == list(range(1, 11))


def test_one_frame_of_tracks():
    tracks = tracks_at([4], [7.0])
    assert aligned_frames(tracks, truth_at([4, 5], [7.0, 7.1])).tolist() == [4, 5]


def test_two_truth_times_near_one_frame_of_tracks():
    # A truth at twice the rate: the nearer row takes the frame, the other stands alone.
    tracks = tracks_at([1, 2, 3], [100.1, 100.2, 100.3])
    truth = truth_at([1, 2, 3], [100.1, 100.14, 100.2])
    frames = aligned_frames(tracks, truth).tolist()
    assert (frames[0], frames[2]) == (1, 2)
    assert frames[1] > 3


def test_rows_of_unsorted_files():
    tracks = make_tracks(standing([3, 1, 2], 1))
    truth = make_truth(standing([2, 4, 1], 7))
    counted = np.array([True, True, False])
    both = side_by_side(tracks, truth, counted, least_iou=0.5, reach=np.inf)
    assert both.numbers.tolist() == [1, 2, 3, 4]
    assert both.truth_row.tolist() == [2, 0, 1]
    assert both.scene.truth_start.tolist() == [0, 1, 2, 2, 3]
    assert both.track_row.tolist() == [1, 0]
    assert both.scene.track_start.tolist() == [0, 1, 1, 2, 2]
    assert both.scene.pair_start.tolist() == [0, 1, 1, 1]


def test_rows_are_taken_out_with_their_pairs():
    tracks, truth = random_scene(5, frames=10)
    counted = np.ones(len(tracks), np.bool_)
    both = side_by_side(tracks, truth, counted, least_iou=0.1, reach=np.inf)
    rng = np.random.default_rng(1)
    keep_truth, keep_track = rng.random(len(truth)) < 0.6, rng.random(len(tracks)) < 0.6
    less = both.only_rows(keep_truth, keep_track)
    assert less.truth_row.tolist() == both.truth_row[keep_truth].tolist()

    def pairs(side):
        scene = side.scene
        row = np.repeat(side.truth_row, np.diff(scene.pair_start))
        return dict(
            zip(zip(row, side.track_row[scene.pair_row], strict=True), scene.distance, strict=True)
        )

    wanted = {
        (t, j): value
        for (t, j), value in pairs(both).items()
        if t in less.truth_row and j in less.track_row
    }
    assert pairs(less) == wanted
    assert len(wanted) > 10
