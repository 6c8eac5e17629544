"""Score tracks against truth, one sequence or several."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from tracker.errors import InputError
from tracker.evaluation.referee import referee_counts
from tracker.evaluation.scope import Scope, scored_pairs
from tracker.evaluation.scores import Counts, Scores
from tracker.log.model import Truth
from tracker.results.tracks import Tracks


@dataclass(frozen=True, slots=True)
class Evaluation:
    """Scores of several sequences; `overall` comes from their summed counts."""

    sequences: dict[str, Scores]

    @property
    def overall(self) -> Scores:
        total = Counts()
        for scores in self.sequences.values():
            total += scores.counts
        return Scores(total)

    def as_dict(self) -> dict[str, Any]:
        """What `margent evaluate --json` prints."""
        return {
            "overall": self.overall.as_dict(),
            "sequences": {name: scores.as_dict() for name, scores in self.sequences.items()},
        }


def evaluate(tracks: Tracks, truth: Truth, scope: Scope | None = None) -> Scores:
    """Score one sequence (CLEAR MOT and identity metrics, counted by motmetrics).

    Raises UsageError where tracks and truth do not fit together, InputError where a track is
    twice in a frame.
    """
    scope = scope or Scope()
    pairs = scored_pairs(tracks, truth, scope)
    for pair in pairs:
        if len(set(pair.track.tolist())) < len(pair.track):
            raise InputError(
                f"a track is twice in frame {pair.number} of '{tracks.name}'",
                remedy="Every track may have one row a frame.",
            )
    return Scores(referee_counts(pairs, tracks.kind, scope))


def evaluate_all(
    sequences: Mapping[str, tuple[Tracks, Truth]], scope: Scope | None = None
) -> Evaluation:
    """Score several sequences by name. Raises what `evaluate` raises."""
    return Evaluation(
        {name: evaluate(tracks, truth, scope) for name, (tracks, truth) in sequences.items()}
    )
