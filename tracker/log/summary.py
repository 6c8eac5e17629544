"""What a detection log looks like, in numbers: the content of `margent inspect`."""

from __future__ import annotations

import dataclasses
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from tracker.log.detections import read_log
from tracker.log.model import DetectionLog, Floats, Kind, Rejection, SequenceFacts, box_corner
from tracker.log.sieve import kind_of_reason

QUANTILES = (0.05, 0.25, 0.5, 0.75, 0.95)
GAPS_SHOWN = 5
REJECTIONS_SHOWN = 5
HISTOGRAM_BINS = 10
NEAR_IOU = 0.9
PAIR_LIMIT = 20_000_000  # comparisons after which the search for near duplicates stops
_LONG_STEP = 1.5  # median steps; beyond it a frame is missing between two times


@dataclass(frozen=True, slots=True)
class Gap:
    """Frames without any row between two frames with some."""

    after: int
    before: int
    missing: int
    seconds: float  # from the frame after which it opens to the frame that closes it


@dataclass(frozen=True, slots=True)
class Spread:
    """Smallest, `QUANTILES` and largest of a number."""

    smallest: float
    quantiles: tuple[float, ...]
    largest: float


@dataclass(frozen=True, slots=True)
class Scores:
    """Quantiles and histogram of the detections' scores."""

    spread: Spread
    edges: tuple[float, ...]
    counts: tuple[int, ...]


@dataclass(frozen=True, slots=True)
class Outside:
    """Boxes that leave the image: in part, or with no part in it."""

    partly: int
    wholly: int


@dataclass(frozen=True, slots=True)
class NearDuplicates:
    """Pairs of boxes in one frame whose IoU is above `NEAR_IOU`; a lower bound if not complete."""

    pairs: int
    complete: bool


@dataclass(frozen=True, slots=True)
class RejectionCount:
    """How many rows one reason would reject, and the first of them."""

    column: str
    reason: str
    count: int
    first_line: int


@dataclass(frozen=True, slots=True)
class LogSummary:
    """One log. Fields that do not apply (no scores, points, no image size) are None."""

    name: str
    path: str
    digest: str
    format: str
    kind: str
    rows: int
    rejected: int
    frames: int
    first_frame: int
    last_frame: int
    first_time: float
    last_time: float
    rate_hz: float
    rate_source: str
    missing_frames: int
    gap_count: int
    longest_gaps: tuple[Gap, ...]
    detections_per_frame: Spread
    scores: Scores | None
    labels: dict[str, int]
    unlabelled: int
    ranges: dict[str, Spread]  # width and height of boxes, x and y of points
    outside: Outside | None
    near_duplicates: NearDuplicates | None
    has_sigma: bool
    embedding_size: int
    facts: SequenceFacts
    notes: tuple[str, ...]
    rejections_by_reason: tuple[RejectionCount, ...]
    first_rejections: tuple[Rejection, ...]

    def as_dict(self) -> dict[str, Any]:
        """Plain values for JSON."""
        return dataclasses.asdict(self)


def inspect_log(
    path: str | Path,
    *,
    columns: Mapping[str, str] | None = None,
    format: str | None = None,
    frame_rate_hz: float | None = None,
    drop_identities: bool = False,
) -> LogSummary:
    """Read a log as `read_log` does (parameters and errors are the same) and summarise it."""
    log = read_log(
        path,
        columns=columns,
        format=format,
        frame_rate_hz=frame_rate_hz,
        drop_identities=drop_identities,
    )
    return summarise(log)


def summarise(log: DetectionLog) -> LogSummary:
    """The summary of a log that has been read."""
    gaps = _gaps(log)
    boxes = box_corner(log.z) if log.kind is Kind.BOX else None
    measured = ("width", "height") if boxes is not None else log.kind.columns
    first_column = log.kind.dimension - len(measured)
    counts = np.bincount(log.label[log.label >= 0], minlength=len(log.labels)).tolist()
    return LogSummary(
        name=log.name,
        path=str(log.path),
        digest=log.digest,
        format=log.format,
        kind=log.kind.value,
        rows=len(log),
        rejected=len(log.rejections),
        frames=log.frame_count,
        first_frame=int(log.frame_numbers[0]),
        last_frame=int(log.frame_numbers[-1]),
        first_time=float(log.frame_times[0]),
        last_time=float(log.frame_times[-1]),
        rate_hz=log.rate_hz,
        rate_source=log.rate_source,
        missing_frames=sum(gap.missing for gap in gaps),
        gap_count=len(gaps),
        longest_gaps=tuple(sorted(gaps, key=lambda gap: (-gap.missing, gap.after))[:GAPS_SHOWN]),
        detections_per_frame=_spread(np.diff(log.offsets)),
        scores=_scores(log.score),
        labels={name: count for name, count in zip(log.labels, counts, strict=True) if count},
        unlabelled=int(np.sum(log.label < 0)),
        ranges={name: _spread(log.z[:, first_column + k]) for k, name in enumerate(measured)},
        outside=None if boxes is None else _outside(boxes, log.facts),
        near_duplicates=None if boxes is None else near_duplicates(boxes, log.offsets),
        has_sigma=log.sigma is not None,
        embedding_size=0 if log.embedding is None else log.embedding.shape[1],
        facts=log.facts,
        notes=log.notes,
        rejections_by_reason=_by_reason(log.rejections),
        first_rejections=log.rejections[:REJECTIONS_SHOWN],
    )


def _spread(values: Any) -> Spread:
    quantiles = np.quantile(values, QUANTILES)
    return Spread(float(np.min(values)), tuple(map(float, quantiles)), float(np.max(values)))


def _scores(score: Floats) -> Scores | None:
    score = score[~np.isnan(score)]
    if not len(score):
        return None
    low, high = float(score.min()), float(score.max())
    span = (0.0, 1.0) if low >= 0.0 and high <= 1.0 else (low, high)
    counts, edges = np.histogram(score, bins=HISTOGRAM_BINS, range=span)
    return Scores(_spread(score), tuple(map(float, edges)), tuple(map(int, counts)))


def _gaps(log: DetectionLog) -> list[Gap]:
    """Missing frame numbers; where numbers run through, steps of time that are too long."""
    steps = np.diff(log.frame_times)
    missing = np.diff(log.frame_numbers) - 1
    if len(steps) and not missing.any():
        usual = float(np.median(steps))
        missing = np.where(steps > _LONG_STEP * usual, np.rint(steps / usual) - 1, 0)
    return [
        Gap(
            int(log.frame_numbers[k]),
            int(log.frame_numbers[k + 1]),
            int(missing[k]),
            float(steps[k]),
        )
        for k in np.flatnonzero(missing).tolist()
    ]


def _outside(boxes: Floats, facts: SequenceFacts) -> Outside | None:
    if facts.image_width is None or facts.image_height is None:
        return None
    left, top = boxes[:, 0], boxes[:, 1]
    right, bottom = left + boxes[:, 2], top + boxes[:, 3]
    crossing = (left < 0) | (top < 0) | (right > facts.image_width) | (bottom > facts.image_height)
    wholly = (
        (right <= 0) | (bottom <= 0) | (left >= facts.image_width) | (top >= facts.image_height)
    )
    return Outside(int(np.sum(crossing & ~wholly)), int(np.sum(wholly)))


def near_duplicates(
    boxes: Floats, offsets: Any, *, iou: float = NEAR_IOU, pair_limit: int = PAIR_LIMIT
) -> NearDuplicates:
    """Count pairs of boxes in one frame with an IoU above `iou`, without looking at all pairs.

    The IoU of two boxes is at most that of their horizontal extents, so in a pair above t the
    left edges differ by less than (1 − t)/t of a width. With the boxes of each frame sorted by
    left edge, box i is compared with i + 1, i + 2, … until its window ends; all i at once.

    boxes : (n, 4) left, top, width, height, frame by frame; offsets : (F + 1,).
    """
    counts = np.diff(offsets)
    frame = np.repeat(np.arange(len(counts)), counts)
    order = np.lexsort((boxes[:, 0], frame))
    left, top, width, height = boxes[order].T
    right, bottom, area = left + width, top + height, width * height
    reach = left + (1.0 - iou) / iou * width
    pairs = compared = 0
    i = np.arange(len(boxes))
    shift = 0
    while len(i):
        shift += 1
        i = i[i + shift < len(boxes)]
        i = i[(frame[i] == frame[i + shift]) & (left[i + shift] < reach[i])]
        compared += len(i)
        if compared > pair_limit:
            return NearDuplicates(pairs, complete=False)
        j = i + shift
        across = np.minimum(right[i], right[j]) - left[j]
        down = np.minimum(bottom[i], bottom[j]) - np.maximum(top[i], top[j])
        common = np.maximum(across, 0.0) * np.maximum(down, 0.0)
        pairs += int(np.sum(common > iou * (area[i] + area[j] - common)))
    return NearDuplicates(pairs, complete=True)


def _by_reason(rejections: tuple[Rejection, ...]) -> tuple[RejectionCount, ...]:
    """Rejections counted by column and kind of reason, the most frequent first."""
    counts: dict[tuple[str, str], list[int]] = {}
    for one in rejections:
        counts.setdefault((one.column, kind_of_reason(one.reason)), []).append(one.line)
    found = [
        RejectionCount(column, reason, len(lines), lines[0])
        for (column, reason), lines in counts.items()
    ]
    return tuple(sorted(found, key=lambda one: (-one.count, one.first_line)))
