"""Higher order tracking accuracy (Luiten et al. 2021): detection, association, localisation."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tracker.evaluation.couples import Couples
from tracker.evaluation.frames import SideBySide
from tracker.kernels.hota import hota_by_frame, hota_counts
from tracker.log.model import Floats, Ints

# Least similarity of a pair: 0.05, 0.10, … 0.95.
THRESHOLDS = np.arange(1, 20) / 20.0
ACCURACIES = ("hota", "deta", "assa", "loca")


@dataclass(frozen=True, slots=True, eq=False)
class HotaCounts:
    """Counts at each threshold; those of several sequences are added.

    hits : (K,) true positives.   association : (K,) sum of their A(c).
    similarity : (K,) sum of their similarities.
    """

    truth_boxes: int
    track_boxes: int
    hits: Ints
    association: Floats
    similarity: Floats

    @classmethod
    def none(cls) -> HotaCounts:
        zeros = np.zeros(len(THRESHOLDS))
        return cls(0, 0, zeros.astype(np.int64), zeros, zeros)

    def __add__(self, other: HotaCounts) -> HotaCounts:
        return HotaCounts(
            self.truth_boxes + other.truth_boxes,
            self.track_boxes + other.track_boxes,
            self.hits + other.hits,
            self.association + other.association,
            self.similarity + other.similarity,
        )

    @property
    def deta(self) -> Floats | None:
        """(K,) detection accuracy TP / (TP + FN + FP); None without any row."""
        union = self.truth_boxes + self.track_boxes - self.hits
        return self.hits / union if self.truth_boxes + self.track_boxes else None

    @property
    def assa(self) -> Floats | None:
        """(K,) association accuracy, the mean of A(c); 0 without true positives."""
        if not self.truth_boxes + self.track_boxes:
            return None
        return self.association / np.maximum(self.hits, 1)

    @property
    def loca(self) -> Floats | None:
        """(K,) mean similarity of the true positives; not-a-number without any."""
        if not self.hits.any():
            return None
        return np.where(self.hits > 0, self.similarity / np.maximum(self.hits, 1), np.nan)

    @property
    def hota(self) -> Floats | None:
        """(K,) √(DetA AssA), which is √(Σ A(c) / (TP + FN + FP))."""
        if not self.truth_boxes + self.track_boxes:
            return None
        return np.sqrt(self.association / (self.truth_boxes + self.track_boxes - self.hits))

    def by_threshold(self) -> dict[str, dict[str, float | None]]:
        """The four accuracies at each threshold, None where there is none."""
        columns = {name: getattr(self, name) for name in ACCURACIES}
        return {
            f"{threshold:.2f}": {
                name: None if values is None or np.isnan(values[k]) else float(values[k])
                for name, values in columns.items()
            }
            for k, threshold in enumerate(THRESHOLDS)
        }

    def mean(self, name: str) -> float | None:
        """One accuracy averaged over the thresholds (LocA over those that have pairs)."""
        values = getattr(self, name)
        return None if values is None else float(np.nanmean(values))


def count_hota(both: SideBySide, couples: Couples) -> HotaCounts:
    """Count one sequence at every threshold."""
    hits, association, similarity = hota_counts(
        both.scene,
        couples.of_pair,
        len(couples),
        couples.object_rows,
        couples.track_rows,
        THRESHOLDS,
    )
    return HotaCounts(len(both.truth_row), len(both.track_row), hits, association, similarity)


def count_hota_by_frame(both: SideBySide, couples: Couples) -> tuple[Ints, Floats, Floats]:
    """(F, K) what each frame adds to the arrays of `HotaCounts`, in their order.

    The pairs and their A(c) are those of the whole sequence: a couple's accuracy is shared out
    among the frames that have it.
    """
    return hota_by_frame(
        both.scene,
        couples.of_pair,
        len(couples),
        couples.object_rows,
        couples.track_rows,
        THRESHOLDS,
    )
