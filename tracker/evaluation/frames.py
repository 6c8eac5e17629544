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

    The truth's own numbers, unless both have times and those contradict the numbers: then each
    truth time goes to the track frame nearest in time, if that is nearer than half the usual
    step, and to a number of its own behind all frames otherwise.
    """
    if truth.time is None or not len(tracks) or not len(truth):
        return truth.frame
    frames, first = np.unique(tracks.frame, return_index=True)
    times = tracks.time[first]
    step = float(np.median(np.diff(times))) if len(times) > 1 else np.inf
    if _from_numbers(frames, times) or _agree(frames, times, truth.frame, truth.time, step):
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


def _from_numbers(frames: Ints, times: Floats) -> bool:
    """Whether the times are nothing but the frame numbers divided by a rate.

    That is what a file without times gets; a truth whose clock starts elsewhere is no
    contradiction then.
    """
    seconds = times[-1] / frames[-1] if frames[-1] else 0.0
    return bool(np.allclose(times, frames * seconds, rtol=1e-9, atol=1e-9))


def _agree(frames: Ints, times: Floats, number: Ints, time: Floats, step: float) -> bool:
    """Whether equal numbers mean equal times; a few late timestamps do not unseat them."""
    at = np.minimum(np.searchsorted(frames, number), len(frames) - 1)
    known = frames[at] == number
    return bool(known.any()) and float(np.median(np.abs(times[at] - time)[known])) <= 0.5 * step
