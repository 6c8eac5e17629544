"""Where objects leave: over the borders of the image, and in exit zones."""

from __future__ import annotations

import numpy as np
import shapely
from numpy.typing import NDArray

from tracker.lifecycle.table import TrackTable
from tracker.log.model import Kind, SequenceFacts
from tracker.results.tracks import TrackState


class Exits:
    """Finds coasting tracks that have left.

    size : (width, height) of the image, None if not known.   zones : exit polygons, in the log's
    coordinates.   share : of the box that must be outside the image or inside a zone.
    """

    def __init__(
        self,
        size: tuple[float, float] | None,
        zones: tuple[shapely.Polygon, ...],
        share: float,
        boxes: bool,
    ) -> None:
        self._size = size
        self._zones = shapely.union_all(zones) if zones else None
        if self._zones is not None:
            shapely.prepare(self._zones)
        self._share = share
        self._boxes = boxes

    def left(self, table: TrackTable) -> NDArray[np.bool_] | None:
        """(n,) coasting tracks that are out of view or in an exit, None if there is none."""
        rows = np.flatnonzero(table.state == TrackState.COASTING)
        if not len(rows):
            return None
        place = table.mean[rows]
        gone = self._outside(place) >= self._share
        if self._zones is not None:
            gone |= self._inside(place) >= self._share
        if not gone.any():
            return None
        out = np.zeros(len(table), np.bool_)
        out[rows[gone]] = True
        return out

    def _outside(self, place: NDArray[np.float64]) -> NDArray[np.float64]:
        """Share of each that is outside the image."""
        if self._size is None:
            return np.zeros(len(place))
        inside = np.ones(len(place))
        for axis in range(2):
            half = 0.5 * np.maximum(place[:, 2 + axis], 1e-9) if self._boxes else 0.0
            low, high = place[:, axis] - half, place[:, axis] + half
            if self._boxes:
                seen = np.minimum(high, self._size[axis]) - np.maximum(low, 0.0)
                inside *= np.clip(seen / (high - low), 0.0, 1.0)
            else:
                inside *= (low >= 0.0) & (high <= self._size[axis])
        return 1.0 - inside

    def _inside(self, place: NDArray[np.float64]) -> NDArray[np.float64]:
        """Share of each that is inside an exit zone."""
        if not self._boxes:
            return shapely.contains_xy(self._zones, place[:, 0], place[:, 1]).astype(np.float64)
        half = 0.5 * np.maximum(place[:, 2:4], 1e-9)
        boxes = shapely.box(
            place[:, 0] - half[:, 0],
            place[:, 1] - half[:, 1],
            place[:, 0] + half[:, 0],
            place[:, 1] + half[:, 1],
        )
        shared = shapely.area(shapely.intersection(boxes, self._zones))
        return shared / (4.0 * half[:, 0] * half[:, 1])


def exits_of(facts: SequenceFacts | None, kind: Kind, share: float | None) -> Exits | None:
    """The exits that a sequence's facts tell of, None if they tell of none or it is switched off.

    The image's borders are for boxes; points may be in any plane.
    """
    if facts is None or share is None:
        return None
    boxes = kind is Kind.BOX
    size = None
    if boxes and facts.image_width and facts.image_height:
        size = (facts.image_width, facts.image_height)
    zones = tuple(shapely.Polygon(zone) for zone in facts.exit_zones)
    if size is None and not zones:
        return None
    return Exits(size, zones, share, boxes)
