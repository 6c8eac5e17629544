"""What a log is once it has been read: columns of equal length, sorted by frame.

Everything is a struct of arrays. `z` is in the *filter's* measurement order, so that the engine
copies nothing: boxes are (centre x, centre y, width, height), points (x, y). Files speak of
left and top; `box_corner` converts.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field, replace
from enum import StrEnum
from pathlib import Path

import numpy as np
from numpy.typing import ArrayLike, NDArray

from tracker.errors import UsageError

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Codes = NDArray[np.int32]


class Kind(StrEnum):
    """What is measured: `box` in image or ground coordinates, `point` in a plane."""

    BOX = "box"
    POINT = "point"

    @property
    def columns(self) -> tuple[str, ...]:
        """The file's measurement columns."""
        return {"box": ("left", "top", "width", "height"), "point": ("x", "y")}[self.value]

    @property
    def sigma_columns(self) -> tuple[str, ...]:
        """Optional per-detection standard deviations, in the order and units of `z`."""
        return {
            "box": ("sigma_x", "sigma_y", "sigma_width", "sigma_height"),
            "point": ("sigma_x", "sigma_y"),
        }[self.value]

    @property
    def dimension(self) -> int:
        return len(self.columns)


@dataclass(frozen=True, slots=True)
class SequenceFacts:
    """What `sequence.toml` beside a log says; every field may be missing."""

    name: str | None = None
    frame_rate_hz: float | None = None
    frames: int | None = None
    image_width: float | None = None
    image_height: float | None = None
    sensor: str | None = None
    exit_zones: tuple[tuple[tuple[float, float], ...], ...] = ()  # polygons, in order of corners


@dataclass(frozen=True, slots=True)
class Rejection:
    """One row that was not used: where it stood, why, and its original text."""

    line: int
    column: str
    reason: str
    text: str


@dataclass(frozen=True, slots=True, eq=False)
class Frame:
    """All detections of one scan.

    number : frame number, `time` : seconds.
    z : (m, d) measurements in filter order.       score : (m,), NaN where the log has none.
    label : (m,) codes, -1 for none.               line : (m,) source lines, -1 when unknown.
    sigma : (m, d) standard deviations or None.    embedding : (m, k) or None.
    """

    number: int
    time: float
    z: Floats
    score: Floats
    label: Codes
    line: Ints
    sigma: Floats | None = None
    embedding: NDArray[np.float32] | None = None

    def __len__(self) -> int:
        return len(self.z)

    @classmethod
    def of_boxes(
        cls, number: int, time: float, corners: ArrayLike, score: ArrayLike | None = None
    ) -> Frame:
        """A frame of boxes given as (m, 4) left, top, width, height.

        Raises UsageError for values that are not finite or sizes that are not positive.
        """
        table = _table(corners, 4)
        if not (table[:, 2:] > 0.0).all():
            raise UsageError(f"frame {number}: widths and heights of boxes are above 0")
        return cls._of(number, time, box_centre(table), score)

    @classmethod
    def of_points(
        cls, number: int, time: float, points: ArrayLike, score: ArrayLike | None = None
    ) -> Frame:
        """A frame of points given as (m, 2) x, y.

        Raises UsageError for values that are not finite.
        """
        return cls._of(number, time, _table(points, 2), score)

    @classmethod
    def _of(cls, number: int, time: float, z: Floats, score: ArrayLike | None) -> Frame:
        count = len(z)
        if not np.isfinite(z).all():
            raise UsageError(f"frame {number} has values that are not finite numbers")
        return cls(
            number=number,
            time=time,
            z=z,
            score=np.full(count, np.nan) if score is None else np.array(score, np.float64),
            label=np.full(count, -1, np.int32),
            line=np.full(count, -1, np.int64),
        )


def _table(values: ArrayLike, columns: int) -> Floats:
    return np.array(values, dtype=np.float64).reshape(-1, columns)


@dataclass(frozen=True, slots=True, eq=False)
class DetectionLog:
    """A detection log, checked and sorted by (frame, source line).

    Rows of frame k are ``offsets[k]:offsets[k + 1]``; the row arrays are as in `Frame`.
    `rate_source` says where the rate came from: 'sequence.toml', 'settings', 'timestamps'
    or 'assumed'.
    """

    name: str
    path: Path
    digest: str  # SHA-256 of the file, hexadecimal
    format: str
    kind: Kind
    facts: SequenceFacts
    rate_hz: float
    rate_source: str
    frame_numbers: Ints  # (F,) strictly increasing
    frame_times: Floats  # (F,) seconds, strictly increasing
    offsets: Ints  # (F + 1,)
    z: Floats
    score: Floats
    label: Codes
    line: Ints
    labels: tuple[str, ...] = ()
    sigma: Floats | None = None
    embedding: NDArray[np.float32] | None = None
    rejections: tuple[Rejection, ...] = ()
    notes: tuple[str, ...] = ()  # sentences for the user: what was assumed or sorted

    def __len__(self) -> int:
        return len(self.z)

    @property
    def frame_count(self) -> int:
        return len(self.frame_numbers)

    def frame(self, k: int) -> Frame:
        """The k-th frame (position, not number)."""
        rows = slice(int(self.offsets[k]), int(self.offsets[k + 1]))
        return Frame(
            number=int(self.frame_numbers[k]),
            time=float(self.frame_times[k]),
            z=self.z[rows],
            score=self.score[rows],
            label=self.label[rows],
            line=self.line[rows],
            sigma=None if self.sigma is None else self.sigma[rows],
            embedding=None if self.embedding is None else self.embedding[rows],
        )

    def select(self, wanted: NDArray[np.bool_]) -> DetectionLog:
        """The log with only the wanted (n,) rows; all frames stay, some perhaps empty."""
        kept = np.concatenate(([0], np.cumsum(wanted)))
        return replace(
            self,
            offsets=kept[self.offsets],
            z=self.z[wanted],
            score=self.score[wanted],
            label=self.label[wanted],
            line=self.line[wanted],
            sigma=None if self.sigma is None else self.sigma[wanted],
            embedding=None if self.embedding is None else self.embedding[wanted],
        )

    def frames(self) -> Iterator[Frame]:
        for k in range(self.frame_count):
            yield self.frame(k)


@dataclass(frozen=True, slots=True, eq=False)
class Truth:
    """Annotated objects, one row an object and frame, sorted by (frame, object, line).

    `object` holds dense ids 0…; `object_names[k]` is the id as the file has it. `scored` is
    False for rows that the file flags as not to be scored. `visibility` is NaN if not given.
    """

    name: str
    path: Path
    digest: str
    format: str
    kind: Kind
    facts: SequenceFacts
    frame: Ints
    time: Floats | None  # seconds; None when the file has frame numbers only
    object: Ints
    object_names: tuple[str, ...]
    z: Floats
    label: Codes
    line: Ints
    scored: NDArray[np.bool_]
    visibility: Floats
    labels: tuple[str, ...] = ()
    rejections: tuple[Rejection, ...] = ()
    notes: tuple[str, ...] = field(default=())

    def __len__(self) -> int:
        return len(self.z)


def box_corner(z: Floats) -> Floats:
    """(n, 4) centre boxes (cx, cy, w, h) as (left, top, width, height)."""
    out = np.array(z, dtype=np.float64)
    out[..., :2] -= 0.5 * out[..., 2:4]
    return out


def box_centre(corner: Floats) -> Floats:
    """(n, 4) corner boxes (left, top, width, height) as (cx, cy, w, h)."""
    out = np.array(corner, dtype=np.float64)
    out[..., :2] += 0.5 * out[..., 2:4]
    return out
