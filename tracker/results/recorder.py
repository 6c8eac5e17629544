"""Frame results turned into rows of tracks, in order, with bounded memory.

A row is handed on once it is known whether its track was ever confirmed. That takes at most
`confirm_window` frames, so that many frames are held back and no more.
"""

from __future__ import annotations

from collections import deque
from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tracker.engine import FrameResult
from tracker.log.model import Codes, Floats, Frame, Ints, Kind
from tracker.results.tracks import TrackState
from tracker.settings import Settings


@dataclass(frozen=True, slots=True, eq=False)
class TrackRows:
    """Rows of one or more frames, sorted by (frame, track); columns as in `Tracks`."""

    frame: Ints
    time: Floats
    track: Ints
    z: Floats  # what is shown: detection or estimate, by ``output.position``
    estimate: Floats
    rate: Floats
    covariance: Floats  # (n, d (d + 1) / 2) upper triangle, row by row
    score: Floats
    label: Codes
    confidence: Floats
    state: NDArray[np.int8]
    reported: NDArray[np.bool_]
    line: Ints

    def __len__(self) -> int:
        return len(self.track)

    @staticmethod
    def join(parts: list[TrackRows]) -> TrackRows:
        return TrackRows(
            *(
                np.concatenate([getattr(part, name) for part in parts])
                for name in TrackRows.__slots__
            )
        )


def no_rows(kind: Kind) -> TrackRows:
    """Rows of no track at all."""
    d = kind.dimension
    place = np.empty((0, d))
    whole, real = np.empty(0, np.int64), np.empty(0)
    return TrackRows(
        frame=whole,
        time=real,
        track=whole,
        z=place,
        estimate=place,
        rate=place,
        covariance=np.empty((0, d * (d + 1) // 2)),
        score=real,
        label=np.empty(0, np.int32),
        confidence=real,
        state=np.empty(0, np.int8),
        reported=np.empty(0, np.bool_),
        line=whole,
    )


class Recorder:
    """Collects frame results and yields finished rows."""

    def __init__(self, settings: Settings, kind: Kind) -> None:
        position = settings.output.position
        self._show_detected = kind is Kind.BOX if position == "auto" else position == "detected"
        life = settings.lifecycle
        self._wait = life.confirm_window if life.rule == "hits" else life.undecided_frames
        self._early = settings.output.report_before_confirmation
        self._coasting_seconds = settings.output.report_coasting_seconds
        self._held: deque[TrackRows] = deque()
        self._confirmed = np.zeros(1024, np.bool_)  # by track id
        self._last_seen = np.zeros(1024)  # by track id
        self._corner = np.triu_indices(kind.dimension)

    @property
    def confirmed(self) -> int:
        """How many tracks have been confirmed so far."""
        return int(self._confirmed.sum())

    def add(self, frame: Frame, result: FrameResult) -> Iterator[TrackRows]:
        """Take one frame in; yield the frames whose rows are settled now."""
        self._note(result)
        self._held.append(self._rows(frame, result))
        while len(self._held) > self._wait:
            yield self._settled(self._held.popleft())

    def finish(self) -> Iterator[TrackRows]:
        """Yield what is held back; tracks not confirmed by now never were."""
        while self._held:
            yield self._settled(self._held.popleft())

    def _note(self, result: FrameResult) -> None:
        if not len(result):
            return
        highest = int(result.track[-1])
        if highest >= len(self._confirmed):
            size = 2 * highest
            self._confirmed = np.concatenate((self._confirmed, np.zeros(size, np.bool_)))
            self._last_seen = np.concatenate((self._last_seen, np.zeros(size)))
        self._confirmed[result.track[result.state != TrackState.TENTATIVE]] = True
        self._last_seen[result.track[result.detection >= 0]] = result.time

    def _rows(self, frame: Frame, result: FrameResult) -> TrackRows:
        count = len(result)
        paired = result.detection >= 0
        line = np.full(count, -1, np.int64)
        line[paired] = frame.line[result.detection[paired]]
        shown = result.estimate
        if self._show_detected:
            shown = shown.copy()
            shown[paired] = frame.z[result.detection[paired]]
        reported = paired.copy()
        if self._coasting_seconds > 0.0:
            unseen = result.time - self._last_seen[result.track]
            reported |= (result.state == TrackState.COASTING) & (
                unseen <= self._coasting_seconds + 1e-9
            )
        if not self._early:
            reported &= result.state != TrackState.TENTATIVE
        confidence = result.confidence
        if confidence is None:
            confidence = np.full(count, np.nan)
        return TrackRows(
            np.full(count, result.number, np.int64),
            np.full(count, result.time),
            result.track,
            shown,
            result.estimate,
            result.rate,
            result.covariance[:, self._corner[0], self._corner[1]],
            result.score,
            result.label,
            confidence,
            result.state,
            reported,
            line,
        )

    def _settled(self, rows: TrackRows) -> TrackRows:
        wanted = self._confirmed[rows.track]
        if wanted.all():
            return rows
        return TrackRows(*(getattr(rows, name)[wanted] for name in TrackRows.__slots__))
