"""What a comparison finds."""

from __future__ import annotations

from dataclasses import asdict, dataclass
from typing import Any

from tracker.comparison.bootstrap import Resampling
from tracker.comparison.objects import ObjectChange, worst_first
from tracker.comparison.parting import Parting
from tracker.evaluation.evaluate import Evaluation
from tracker.evaluation.scores import LIMITED

LOWER_BETTER = (
    "motp", "switches", "false_positives", "misses", "fragmentations", "mostly_lost",
    "identity_false_positives", "identity_misses", "gospa", "gospa_localisation", "gospa_missed",
    "gospa_false", "ospa", "ospa_localisation", "ospa_cardinality",
)  # fmt: skip
# Scores of which more is neither better nor worse.
_NEITHER = (
    "frames", "objects", "truth_boxes", "track_boxes", "partially_tracked", "distance_sum",
)  # fmt: skip
COMPARED = tuple(name for name in LIMITED if name not in _NEITHER)


@dataclass(frozen=True, slots=True)
class Change:
    """One score of both runs.

    difference : B − A.   lower, upper : its interval, None without resampling.   b_better : share
    of resamples in which B is better, ties counting half.
    """

    score: str
    a: float | None
    b: float | None
    difference: float | None
    lower: float | None = None
    upper: float | None = None
    b_better: float | None = None

    @property
    def verdict(self) -> str:
        """`better` or `worse` where the interval leaves 0 out, `no clear difference` else, `same`
        where nothing differs in any resample, and `unknown` without an interval."""
        if self.lower is None or self.upper is None:
            return "unknown"
        if self.difference == self.lower == self.upper == 0.0:
            return "same"
        if self.lower <= 0.0 <= self.upper:
            return "no clear difference"
        return "better" if (self.lower > 0.0) != (self.score in LOWER_BETTER) else "worse"

    def as_dict(self) -> dict[str, Any]:
        return asdict(self) | {"verdict": self.verdict}


@dataclass(frozen=True, slots=True)
class Comparison:
    """Two runs, A and B, over the same sequences.

    a, b : their scores.   overall : changes by score, with intervals.   sequences : changes of
    each sequence.   objects : every object of the truth, in order of sequence, then file.
    partings : where the runs part, by sequence.   resampling : what the intervals come from, None
    where there were too few units to draw from.
    """

    a: Evaluation
    b: Evaluation
    overall: dict[str, Change]
    sequences: dict[str, dict[str, Change]]
    objects: tuple[ObjectChange, ...]
    partings: dict[str, Parting]
    resampling: Resampling | None
    notes: tuple[str, ...] = ()

    def as_dict(self) -> dict[str, Any]:
        """What `margent compare --json` prints."""
        return {
            "overall": {name: change.as_dict() for name, change in self.overall.items()},
            "sequences": {
                name: {
                    score: {"a": change.a, "b": change.b, "difference": change.difference}
                    for score, change in changes.items()
                }
                for name, changes in self.sequences.items()
            },
            "resampling": None if self.resampling is None else asdict(self.resampling),
            "objects": [item.as_dict() for item in worst_first(self.objects)],
            "partings": {name: item.as_dict() for name, item in self.partings.items()},
            "notes": list(self.notes),
        }
