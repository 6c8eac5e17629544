"""Truth and tracks side by side, frame by frame."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from tracker.log.model import Floats, Ints, Truth
from tracker.results.tracks import Tracks


@dataclass(frozen=True, slots=True, eq=False)
class FramePair:
    """One frame's annotated objects and track rows.

    truth : (n,) dense object ids.   truth_row : (n,) rows of the truth file's arrays.
    track : (m,) track ids.   track_row : (m,) rows of the tracks' arrays.   *_z : (·, d).
    """

    number: int
    truth: Ints
    truth_z: Floats
    truth_row: Ints
    track: Ints
    track_z: Floats
    track_row: Ints

    def only_truth(self, keep: NDArray[np.bool_]) -> FramePair:
        return replace(
            self,
            truth=self.truth[keep],
            truth_z=self.truth_z[keep],
            truth_row=self.truth_row[keep],
        )

    def only_tracks(self, keep: NDArray[np.bool_]) -> FramePair:
        return replace(
            self,
            track=self.track[keep],
            track_z=self.track_z[keep],
            track_row=self.track_row[keep],
        )


def frame_pairs(tracks: Tracks, truth: Truth, counted: NDArray[np.bool_]) -> list[FramePair]:
    """All frames that truth or tracks have, in order; of the tracks only the `counted` rows.

    Frames are matched by number, or by time where the truth has times of its own that the
    numbers contradict. Track rows in frames that the truth does not reach stay: they are wrong.
    """
    truth_frame = aligned_frames(tracks, truth)
    truth_row = np.argsort(truth_frame, kind="stable")
    track_row = np.flatnonzero(counted)
    track_row = track_row[np.argsort(tracks.frame[track_row], kind="stable")]
    numbers = np.union1d(truth_frame, tracks.frame[track_row])
    truth_at = np.searchsorted(truth_frame[truth_row], numbers, side="left")
    truth_end = np.searchsorted(truth_frame[truth_row], numbers, side="right")
    track_at = np.searchsorted(tracks.frame[track_row], numbers, side="left")
    track_end = np.searchsorted(tracks.frame[track_row], numbers, side="right")
    pairs = []
    for k, number in enumerate(numbers.tolist()):
        mine = truth_row[truth_at[k] : truth_end[k]]
        theirs = track_row[track_at[k] : track_end[k]]
        pairs.append(
            FramePair(
                number,
                truth.object[mine],
                truth.z[mine],
                mine,
                tracks.track[theirs],
                tracks.z[theirs],
                theirs,
            )
        )
    return pairs


def aligned_frames(tracks: Tracks, truth: Truth) -> Ints:
    """(n,) frame of each truth row in the tracks' numbering.

    The truth's own numbers, unless both have times and equal numbers mean different times: then
    each truth time goes to the track frame nearest in time, if that is nearer than half the usual
    step, and to a number of its own behind all frames otherwise.
    """
    if truth.time is None or not len(tracks) or not len(truth):
        return truth.frame
    frames, first = np.unique(tracks.frame, return_index=True)
    times = tracks.time[first]
    step = float(np.median(np.diff(times))) if len(times) > 1 else np.inf
    at = np.searchsorted(frames, truth.frame)
    known = (at < len(frames)) & (frames[np.minimum(at, len(frames) - 1)] == truth.frame)
    if known.any() and np.all(np.abs(times[at[known]] - truth.time[known]) <= 0.5 * step):
        return truth.frame
    order = np.argsort(times)
    right = np.clip(np.searchsorted(times[order], truth.time), 1, max(1, len(times) - 1))
    left = right - 1
    right = np.minimum(right, len(times) - 1)
    closer = np.abs(times[order][left] - truth.time) <= np.abs(times[order][right] - truth.time)
    nearest = order[np.where(closer, left, right)]
    near = np.abs(times[nearest] - truth.time) <= 0.5 * step
    beyond = frames[-1] + 1 + np.unique(truth.time, return_inverse=True)[1]
    return np.where(near, frames[nearest], beyond)
