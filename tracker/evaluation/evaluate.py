"""Score tracks against truth, one sequence or several."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from tracker.evaluation import referee
from tracker.evaluation.counts import count
from tracker.evaluation.couples import find_couples
from tracker.evaluation.hota import HotaCounts, count_hota
from tracker.evaluation.scope import Scope, close_pairs, scored_rows
from tracker.evaluation.scores import Counts, Scores
from tracker.log.model import Truth
from tracker.results.tracks import Tracks


@dataclass(frozen=True, slots=True)
class Evaluation:
    """Scores of several sequences; `overall` comes from their summed counts."""

    sequences: dict[str, Scores]

    @property
    def overall(self) -> Scores:
        counts, hota = Counts(), HotaCounts.none()
        for scores in self.sequences.values():
            counts += scores.counts
            hota += scores.hota_counts
        return Scores(counts, hota)

    def as_dict(self) -> dict[str, Any]:
        """What `margent evaluate --json` prints."""
        return {
            "overall": self.overall.as_dict(),
            "sequences": {name: scores.as_dict() for name, scores in self.sequences.items()},
        }


def evaluate(
    tracks: Tracks, truth: Truth, scope: Scope | None = None, *, with_referee: bool = True
) -> Scores:
    """Score one sequence: CLEAR MOT, identity metrics and HOTA.

    with_referee : whether motmetrics counts too and has to agree.

    Raises UsageError where tracks and truth do not fit together, InputError where a track or
    object is twice in a frame, InternalError where the referee counts otherwise.
    """
    scope = scope or Scope()
    both = scored_rows(tracks, truth, scope)
    close = close_pairs(both, truth.kind, scope)
    couples = find_couples(both)
    counts = count(both, couples, close)
    if with_referee:
        referee.check(counts, both.only_pairs(close), tracks.name)
    return Scores(counts, count_hota(both, couples))


def evaluate_all(
    sequences: Mapping[str, tuple[Tracks, Truth]],
    scope: Scope | None = None,
    *,
    with_referee: bool = True,
) -> Evaluation:
    """Score several sequences by name. Raises what `evaluate` raises."""
    return Evaluation(
        {
            name: evaluate(tracks, truth, scope, with_referee=with_referee)
            for name, (tracks, truth) in sequences.items()
        }
    )
