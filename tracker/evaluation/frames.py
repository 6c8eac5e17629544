"""Truth and tracks side by side, frame by frame."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tracker.errors import InputError
from tracker.kernels.clearmot import Scene
from tracker.kernels.pairing import pair_boxes, pair_points
from tracker.log.model import Floats, Ints, Kind, Truth
from tracker.results.tracks import Tracks


@dataclass(frozen=True, slots=True, eq=False)
class SideBySide:
    """A sequence's annotated rows and track rows in frames, with every possible pair.

    numbers : (F,) frame numbers of the tracks.   truth_row : (T,) rows of the truth's arrays.
    track_row : (M,) rows of the tracks' arrays.   objects, tracks : how many identities.
    """

    numbers: Ints
    truth_row: Ints
    track_row: Ints
    objects: int
    tracks: int
    scene: Scene

    def only_pairs(self, keep: NDArray[np.bool_]) -> Scene:
        """The scene with only the (E,) wanted pairs."""
        scene = self.scene
        return scene._replace(
            pair_start=_starts(scene.pair_start, keep),
            pair_row=scene.pair_row[keep],
            distance=scene.distance[keep],
            similarity=scene.similarity[keep],
        )

    def only_rows(self, truth: NDArray[np.bool_], track: NDArray[np.bool_]) -> SideBySide:
        """Only the (T,) and (M,) wanted rows; identities are numbered anew."""
        scene = self.scene
        keep = np.repeat(truth, np.diff(scene.pair_start)) & track[scene.pair_row]
        thinned = self.only_pairs(keep)
        place = np.cumsum(track) - 1
        objects, things = np.unique(scene.truth[truth], return_inverse=True)
        tracks, ids = np.unique(scene.track[track], return_inverse=True)
        return SideBySide(
            self.numbers,
            self.truth_row[truth],
            self.track_row[track],
            len(objects),
            len(tracks),
            Scene(
                _starts(scene.truth_start, truth),
                things.astype(np.int64),
                _starts(scene.track_start, track),
                ids.astype(np.int64),
                np.append(thinned.pair_start[:-1][truth], thinned.pair_start[-1]),
                place[thinned.pair_row],
                thinned.distance,
                thinned.similarity,
            ),
        )


def side_by_side(
    tracks: Tracks, truth: Truth, counted: NDArray[np.bool_], *, least_iou: float, reach: float
) -> SideBySide:
    """All frames that truth or tracks have, in order; of the tracks only the `counted` rows.

    least_iou : of paired boxes.   reach : largest distance of paired points.

    Frames are matched by number, or by time where the truth has times of its own that the
    numbers contradict. Track rows in frames that the truth does not reach stay: they are wrong.
    The similarity of boxes is their IoU, that of points falls from 1 to 0 at `reach`.

    Raises InputError where an identity is twice in a frame.
    """
    truth_frame = aligned_frames(tracks, truth)
    truth_row = _ordered(truth_frame, truth.object)
    track_row = np.flatnonzero(counted)
    track_row = track_row[_ordered(tracks.frame[track_row], tracks.track[track_row])]
    truth_frame, track_frame = truth_frame[truth_row], tracks.frame[track_row]
    objects, things = np.unique(truth.object[truth_row], return_inverse=True)
    identities, ids = np.unique(tracks.track[track_row], return_inverse=True)
    twin = _twin(track_frame, ids)
    if twin is not None:
        raise InputError(
            f"track {identities[ids[twin]]} is twice in frame {track_frame[twin]} "
            f"of '{tracks.name}'",
            remedy="Every track may have one row a frame.",
        )
    twin = _twin(truth_frame, things)
    if twin is not None:
        name = truth.object_names[objects[things[twin]]]
        raise InputError(
            f"object '{name}' is twice in frame {truth_frame[twin]}",
            path=truth.path,
            remedy="Every object may have one row a frame.",
        )
    numbers = np.union1d(_different(truth_frame), _different(track_frame))
    starts = [
        np.append(np.searchsorted(frame, numbers), len(frame))
        for frame in (truth_frame, track_frame)
    ]
    z = np.ascontiguousarray(truth.z[truth_row]), np.ascontiguousarray(tracks.z[track_row])
    if truth.kind is Kind.BOX:
        pair_start, pair_row, similarity = pair_boxes(starts[0], z[0], starts[1], z[1], least_iou)
        distance = 1.0 - similarity
    else:
        pair_start, pair_row, distance = pair_points(starts[0], z[0], starts[1], z[1], reach)
        similarity = 1.0 - distance / reach
    scene = Scene(
        starts[0],
        things.astype(np.int64),
        starts[1],
        ids.astype(np.int64),
        pair_start,
        pair_row,
        distance,
        similarity,
    )
    return SideBySide(numbers, truth_row, track_row, len(objects), len(identities), scene)


def _ordered(frame: Ints, identity: Ints) -> Ints:
    """Rows by (frame, identity); files are mostly in that order already."""
    later, same = frame[1:] > frame[:-1], frame[1:] == frame[:-1]
    if np.all(later | (same & (identity[1:] >= identity[:-1]))):
        return np.arange(len(frame))
    return np.lexsort((identity, frame))


def _different(frame: Ints) -> Ints:
    """The frames that are there, of sorted ones."""
    return frame[np.append(True, frame[1:] > frame[:-1])] if len(frame) else frame


def _starts(start: Ints, keep: NDArray[np.bool_]) -> Ints:
    """First rows of the same groups, of the kept rows only."""
    return np.concatenate(([0], np.cumsum(keep)))[start]


def _twin(frame: Ints, identity: Ints) -> int | None:
    """The first row that has the frame and identity of the row before it."""
    same = np.flatnonzero((frame[1:] == frame[:-1]) & (identity[1:] == identity[:-1]))
    return int(same[0]) if len(same) else None


def aligned_frames(tracks: Tracks, truth: Truth) -> Ints:
    """(n,) frame of each truth row in the tracks' numbering.

    The truth's own numbers, unless both have times and those contradict the numbers: then each
    truth time goes to the track frame nearest in time, if that is nearer than half the usual
    step and no other truth time is nearer to it, and to a number of its own behind all frames
    otherwise.
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
    apart = np.abs(times[nearest] - truth.time)
    nearest_of = np.full(len(times), np.inf)
    np.minimum.at(nearest_of, nearest, apart)
    # Of two truth times as near, the earlier.
    first_of = np.full(len(times), np.inf)
    at_least = apart <= nearest_of[nearest]
    np.minimum.at(first_of, nearest[at_least], truth.time[at_least])
    near = (apart <= 0.5 * step) & (truth.time == first_of[nearest])
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
