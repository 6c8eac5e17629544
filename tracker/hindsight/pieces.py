"""What the engine decided, kept in a few numbers a detection: the pieces that hindsight works on.

A *piece* is a part of an object's life that is held together by the engine's own decisions: at
first a confirmed track, its detections and nothing else.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from tracker.engine import FrameResult
from tracker.log.model import Floats, Frame, Ints
from tracker.results.tracks import TrackState


@dataclass(frozen=True, slots=True, eq=False)
class Scans:
    """The frames that the engine saw, empty ones included: (S,) numbers and seconds."""

    number: Ints
    time: Floats


@dataclass(frozen=True, slots=True, eq=False)
class Pieces:
    """Pieces and their detections, the latter sorted by (piece, scan).

    start : (P + 1,) first detection of each piece.   identity : (P,) the track's id.
    scan : (N,) number of the scan, from 0.   row : (N,) row of the log.
    online : (N,) the engine's track.   log_confidence : (N,) log of the engine's identity
    confidence after that detection, 0 where it did not explain.
    """

    start: Ints
    identity: Ints
    scan: Ints
    row: Ints
    online: Ints
    log_confidence: Floats

    def __len__(self) -> int:
        return len(self.identity)

    @property
    def first(self) -> Ints:
        """(P,) scan of each piece's first detection."""
        return self.scan[self.start[:-1]]

    @property
    def last(self) -> Ints:
        """(P,) scan of each piece's last detection."""
        return self.scan[self.start[1:] - 1]

    @property
    def of_detection(self) -> Ints:
        """(N,) piece of each detection."""
        return np.repeat(np.arange(len(self)), np.diff(self.start))

    def regrouped(self, label: Ints, identity: Ints) -> Pieces:
        """Pieces made anew: (N,) label 0 … of each detection, -1 to leave it out.

        identity : of each label. Detections of one label are in different scans.
        """
        kept = np.flatnonzero(label >= 0)
        order = kept[np.lexsort((self.scan[kept], label[kept]))]
        count = np.bincount(label[order], minlength=len(identity))
        return Pieces(
            np.concatenate(([0], np.cumsum(count))),
            identity,
            self.scan[order],
            self.row[order],
            self.online[order],
            self.log_confidence[order],
        )

    def only(self, wanted: NDArray[np.bool_]) -> Pieces:
        """The wanted (P,) pieces."""
        number = np.where(wanted, np.cumsum(wanted) - 1, -1)
        return self.regrouped(number[self.of_detection], self.identity[wanted])

    def with_identity(self, identity: Ints) -> Pieces:
        """The same under other ids."""
        return replace(self, identity=identity)


class Collector:
    """Takes frame results in and keeps which detection went to which track.

    Memory is of the order of the detections, not of track rows.
    """

    def __init__(self) -> None:
        self._numbers: list[int] = []
        self._times: list[float] = []
        self._parts: list[tuple[Ints, Ints, Ints, Floats]] = []
        self._rows = 0
        self._confirmed: list[Ints] = []

    def add(self, frame: Frame, result: FrameResult) -> None:
        """Take one frame in; frames come in the order of the log's rows."""
        scan = len(self._times)
        self._numbers.append(frame.number)
        self._times.append(frame.time)
        paired = np.flatnonzero(result.detection >= 0)
        if len(paired):
            confidence = np.zeros(len(paired))
            if result.confidence is not None:
                with np.errstate(divide="ignore"):
                    confidence = np.log(result.confidence[paired])
            self._parts.append(
                (
                    np.full(len(paired), scan),
                    result.track[paired],
                    self._rows + result.detection[paired],
                    confidence,
                )
            )
        events = result.transitions
        fresh = events.track[events.after == TrackState.CONFIRMED]
        if len(fresh):
            self._confirmed.append(fresh)
        self._rows += len(frame)

    def finish(self) -> tuple[Scans, Pieces]:
        """The scans, and one piece for each track that was ever confirmed, in order of id."""
        scans = Scans(np.array(self._numbers, np.int64), np.array(self._times, np.float64))
        if not self._parts or not self._confirmed:
            whole, real = np.empty(0, np.int64), np.empty(0)
            return scans, Pieces(np.zeros(1, np.int64), whole, whole, whole, whole, real)
        scan, track, row, confidence = (
            np.concatenate([part[k] for part in self._parts]) for k in range(4)
        )
        identity = np.unique(np.concatenate(self._confirmed))
        place = np.searchsorted(identity, track)
        place[place == len(identity)] = 0
        label = np.where(identity[place] == track, place, -1)
        everything = Pieces(np.array([0, len(scan)]), identity[:1], scan, row, track, confidence)
        return scans, everything.regrouped(label, identity)
