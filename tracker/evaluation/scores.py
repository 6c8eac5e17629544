"""Counts of one or more sequences and the ratios made of them.

Overall figures come from summed counts, never from averaged ratios. A ratio whose denominator is
zero is None: an empty sequence has no precision, not one of 0 or 1.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import asdict, dataclass, fields
from typing import Any

from tracker.evaluation.durations import Durations
from tracker.evaluation.hota import HotaCounts
from tracker.evaluation.set_distance import NAMES as SET_SCORES
from tracker.evaluation.set_distance import SetDistances
from tracker.log.model import Kind


@dataclass(frozen=True, slots=True)
class Counts:
    """What is counted in a sequence (CLEAR MOT: Bernardin and Stiefelhagen 2008; identity:
    Ristani et al. 2016)."""

    frames: int = 0
    objects: int = 0  # different annotated objects
    truth_boxes: int = 0  # annotated rows that are scored
    track_boxes: int = 0  # reported rows that are scored
    matches: int = 0  # paired rows, switches included
    switches: int = 0
    false_positives: int = 0
    misses: int = 0
    fragmentations: int = 0
    mostly_tracked: int = 0  # objects paired in at least 80% of their frames
    partially_tracked: int = 0
    mostly_lost: int = 0  # less than 20%
    distance_sum: float = 0.0  # of paired rows
    identity_matches: int = 0  # IDTP
    identity_false_positives: int = 0  # IDFP
    identity_misses: int = 0  # IDFN

    def __add__(self, other: Counts) -> Counts:
        return Counts(
            *(getattr(self, item.name) + getattr(other, item.name) for item in fields(Counts))
        )


@dataclass(frozen=True, slots=True)
class Scores:
    """Scores of one sequence or of several together; ratios are between 0 and 1, or None.

    Boxes and points together have no mean distance (MOTP, GOSPA, OSPA): what boxes lack in overlap
    and what points are apart have no common unit.
    """

    counts: Counts
    hota_counts: HotaCounts
    set_distances: SetDistances
    durations: Durations
    kinds: frozenset[Kind]

    @classmethod
    def total(cls, parts: Iterable[Scores]) -> Scores:
        """Scores of the summed counts."""
        counts, hota = Counts(), HotaCounts.none()
        sets, durations = SetDistances(), Durations.none()
        kinds: frozenset[Kind] = frozenset()
        for part in parts:
            counts += part.counts
            hota += part.hota_counts
            sets += part.set_distances
            durations += part.durations
            kinds |= part.kinds
        return cls(counts, hota, sets, durations, kinds)

    @property
    def mota(self) -> float | None:
        """1 − (misses + false positives + switches) / annotated rows; may be negative."""
        c = self.counts
        wrong = _ratio(c.misses + c.false_positives + c.switches, c.truth_boxes)
        return None if wrong is None else 1.0 - wrong

    @property
    def motp(self) -> float | None:
        """Mean *distance* of paired rows, lower is better: 1 − IoU of boxes, units of points."""
        if len(self.kinds) > 1:
            return None
        return _ratio(self.counts.distance_sum, self.counts.matches)

    @property
    def idf1(self) -> float | None:
        """2 IDTP / (annotated + reported rows)."""
        c = self.counts
        return _ratio(2 * c.identity_matches, c.truth_boxes + c.track_boxes)

    @property
    def idp(self) -> float | None:
        """Identity precision, IDTP / reported rows."""
        return _ratio(self.counts.identity_matches, self.counts.track_boxes)

    @property
    def idr(self) -> float | None:
        """Identity recall, IDTP / annotated rows."""
        return _ratio(self.counts.identity_matches, self.counts.truth_boxes)

    @property
    def precision(self) -> float | None:
        """Paired rows / reported rows."""
        return _ratio(self.counts.matches, self.counts.track_boxes)

    @property
    def recall(self) -> float | None:
        """Paired rows / annotated rows."""
        return _ratio(self.counts.matches, self.counts.truth_boxes)

    @property
    def hota(self) -> float | None:
        """Higher order tracking accuracy, averaged over the thresholds."""
        return self.hota_counts.mean("hota")

    @property
    def deta(self) -> float | None:
        """Detection accuracy, averaged over the thresholds."""
        return self.hota_counts.mean("deta")

    @property
    def assa(self) -> float | None:
        """Association accuracy, averaged over the thresholds."""
        return self.hota_counts.mean("assa")

    @property
    def loca(self) -> float | None:
        """Localisation accuracy: similarity of pairs, averaged over the thresholds with any."""
        return self.hota_counts.mean("loca")

    @property
    def set_scores(self) -> dict[str, float | None]:
        """GOSPA and OSPA with what they are made of."""
        return SetDistances().scores() if len(self.kinds) > 1 else self.set_distances.scores()

    def value(self, name: str) -> float | None:
        """One of the scores of `LIMITED` by its name."""
        if name in RATIOS:
            return getattr(self, name)
        return self.set_scores[name] if name in SET_SCORES else getattr(self.counts, name)

    def as_dict(self) -> dict[str, Any]:
        """All scores and counts by name, as `margent evaluate --json` prints them."""
        ratios = {name: getattr(self, name) for name in RATIOS}
        nested = {
            "durations": self.durations.summary(),
            "hota_by_threshold": self.hota_counts.by_threshold(),
        }
        return ratios | asdict(self.counts) | self.set_scores | nested


RATIOS = (
    "hota", "deta", "assa", "loca", "mota", "motp", "idf1", "idp", "idr", "precision", "recall",
)  # fmt: skip

# Every score that has one number, by the name that --json and limits use.
LIMITED = (*RATIOS, *(item.name for item in fields(Counts)), *SET_SCORES)


def _ratio(part: float, whole: float) -> float | None:
    return part / whole if whole else None
