"""Which track, and which detection, is on each annotated object in each frame."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tracker.causes.record import RunRecord
from tracker.evaluation.clearmot import pair_frames
from tracker.evaluation.scope import Scope, close_pairs, scored_rows
from tracker.log.model import Floats, Ints, Truth
from tracker.results import Tracks, TrackState


@dataclass(frozen=True, slots=True, eq=False)
class Objects:
    """The scored rows of the truth, sorted by (object, frame).

    frame, object : (T,).   track : (T,) track paired by CLEAR MOT, -1 for none.
    detection : (T,) number of the detection on the object in that frame, -1 for none.
    z : (T, d).   time : (T,) seconds.
    """

    frame: Ints
    time: Floats
    object: Ints
    names: tuple[str, ...]
    track: Ints
    detection: Ints
    z: Floats

    def __len__(self) -> int:
        return len(self.frame)


@dataclass(frozen=True, slots=True, eq=False)
class FalseRows:
    """Reported track rows without an object, sorted by (track, frame); rows of `Tracks`."""

    row: Ints


def pair_objects(
    record: RunRecord, truth: Truth, scope: Scope
) -> tuple[Objects, FalseRows, dict[tuple[int, int], int]]:
    """Pair the run's tracks and detections with the truth.

    Returns the objects' rows, the false track rows, and (frame, detection) → object for every
    detection on an object. Raises what `scored_rows` raises.
    """
    truth_row, frame, track, unpaired = _paired(record.tracks, truth, scope)
    seen_row, seen_frame, detection, _ = _paired(_as_tracks(record), truth, scope)
    detection_of = dict(zip(seen_row.tolist(), detection.tolist(), strict=True))
    of_detection = {
        (f, d): int(truth.object[row])
        for row, f, d in zip(
            seen_row.tolist(), seen_frame.tolist(), detection.tolist(), strict=True
        )
        if d >= 0
    }
    order = np.lexsort((frame, truth.object[truth_row]))
    truth_row, frame, track = truth_row[order], frame[order], track[order]
    time = truth.time[truth_row] if truth.time is not None else frame / _rate(record.tracks)
    objects = Objects(
        frame,
        time,
        truth.object[truth_row],
        truth.object_names,
        track,
        np.array([detection_of.get(row, -1) for row in truth_row.tolist()], np.int64),
        truth.z[truth_row],
    )
    tracks = record.tracks
    unpaired = unpaired[np.lexsort((tracks.frame[unpaired], tracks.track[unpaired]))]
    return objects, FalseRows(unpaired), of_detection


def _paired(tracks: Tracks, truth: Truth, scope: Scope) -> tuple[Ints, Ints, Ints, Ints]:
    """Truth rows, their frames, the identity paired with each (-1: none); unpaired track rows."""
    both = scored_rows(tracks, truth, scope)
    scene = both.only_pairs(close_pairs(both, tracks.kind, scope))
    match = pair_frames(scene, both.objects)
    frame = np.repeat(both.numbers, np.diff(scene.truth_start))
    partner = np.full(len(match), -1, np.int64)
    hit = match >= 0
    rows = scene.pair_row[match[hit]]
    partner[hit] = tracks.track[both.track_row[rows]]
    free = np.ones(len(both.track_row), np.bool_)
    free[rows] = False
    return both.truth_row, frame, partner, both.track_row[free]


def _as_tracks(record: RunRecord) -> Tracks:
    """The detections as if each were a track of its own, named by its number in the frame."""
    count = len(record.z)
    tracks = record.tracks
    times = dict(zip(tracks.frame.tolist(), tracks.time.tolist(), strict=True))
    rate = _rate(tracks)
    frames = record.detection_frame
    return Tracks(
        name=tracks.name,
        kind=tracks.kind,
        facts=tracks.facts,
        frame=frames,
        time=np.array([times.get(f, f / rate) for f in frames.tolist()]),
        track=record.detection_number,
        z=record.z,
        score=record.score,
        label=np.full(count, -1, np.int32),
        labels=(),
        state=np.full(count, TrackState.CONFIRMED, np.int8),
        reported=np.ones(count, np.bool_),
        line=np.full(count, -1, np.int64),
    )


def _rate(tracks: Tracks) -> float:
    frames, first = np.unique(tracks.frame, return_index=True)
    if len(frames) < 2:
        return 1.0
    times = tracks.time[first]
    return float((frames[-1] - frames[0]) / (times[-1] - times[0]))
