"""What a cost term sees: the candidate pairs of a frame, one array entry a pair."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from tracker.kernels.gate import Candidates
from tracker.lifecycle.table import TrackTable
from tracker.log.model import Codes, Floats, Frame, Ints


class CandidatePairs:
    """E candidate pairs. Every property is an array with one entry a pair; do not write to them."""

    __slots__ = ("_candidates", "_detections", "_frame", "_table", "_tracks")

    def __init__(
        self,
        candidates: Candidates,
        table: TrackTable,
        frame: Frame,
        tracks: Ints | None,
        detections: Ints | None,
    ) -> None:
        self._candidates = candidates
        self._table = table
        self._frame = frame
        self._tracks = tracks
        self._detections = detections

    def __len__(self) -> int:
        return len(self.distance)

    @property
    def distance(self) -> Floats:
        """(E,) squared Mahalanobis distance."""
        return self._candidates.distance

    @property
    def log_volume(self) -> Floats:
        """(E,) ln det S."""
        return self._candidates.log_volume

    @property
    def overlap(self) -> Floats:
        """(E,) IoU of boxes, else 0."""
        return self._candidates.overlap

    @property
    def row(self) -> Ints:
        """(E,) row of the track table."""
        row = np.repeat(np.arange(len(self._candidates.start) - 1), np.diff(self._candidates.start))
        return row if self._tracks is None else self._tracks[row]

    @property
    def detection(self) -> Ints:
        """(E,) number of the detection in the frame."""
        column = self._candidates.column
        return column if self._detections is None else self._detections[column]

    @property
    def track_state(self) -> Floats:
        """(E, s) predicted state: measured components, then their rates."""
        return self._table.mean[self.row]

    @property
    def unseen_seconds(self) -> Floats:
        """(E,) time since the track's last detection."""
        return self._frame.time - self._table.last_seen[self.row]

    @property
    def track_label(self) -> Codes:
        """(E,) label code of the track, -1 if unknown."""
        return self._table.label[self.row]

    @property
    def measurement(self) -> Floats:
        """(E, d) the detection, in filter order (boxes by their centre)."""
        return self._frame.z[self.detection]

    @property
    def seen(self) -> Floats:
        """(m, d) all detections of the frame, in filter order; index by `detection`."""
        return self._frame.z

    @property
    def score(self) -> Floats:
        """(E,) score of the detection, nan if it has none."""
        return self._frame.score[self.detection]

    @property
    def detection_label(self) -> Codes:
        """(E,) label code of the detection, -1 if unknown."""
        return self._frame.label[self.detection]

    @property
    def track_embeddings(self) -> NDArray[np.float32]:
        """(tracks, k) running mean of all tracks; index by `row`."""
        return self._table.embedding

    @property
    def detection_embeddings(self) -> NDArray[np.float32] | None:
        """(detections, k) of the whole frame, None if the log has none; index by `detection`."""
        return self._frame.embedding
