"""Score tracks against truth, one sequence or several."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

from tracker.errors import InputError
from tracker.evaluation.frames import FramePair
from tracker.evaluation.referee import referee_counts
from tracker.evaluation.scope import Scope, scored_pairs
from tracker.evaluation.scores import Counts, Scores
from tracker.log.model import Ints, Truth
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
        _refuse_twins(pair, tracks, truth)
    return Scores(referee_counts(pairs, tracks.kind, scope))


def _refuse_twins(pair: FramePair, tracks: Tracks, truth: Truth) -> None:
    track = _repeated(pair.track)
    if track is not None:
        raise InputError(
            f"track {track} is twice in frame {pair.number} of '{tracks.name}'",
            remedy="Every track may have one row a frame.",
        )
    thing = _repeated(pair.truth)
    if thing is not None:
        raise InputError(
            f"object '{truth.object_names[thing]}' is twice in frame {pair.number}",
            path=truth.path,
            remedy="Every object may have one row a frame.",
        )


def _repeated(identities: Ints) -> int | None:
    """The first identity that is there more than once."""
    ordered = np.sort(identities)
    twin = np.flatnonzero(ordered[1:] == ordered[:-1])
    return int(ordered[twin[0]]) if len(twin) else None


def evaluate_all(
    sequences: Mapping[str, tuple[Tracks, Truth]], scope: Scope | None = None
) -> Evaluation:
    """Score several sequences by name. Raises what `evaluate` raises."""
    return Evaluation(
        {name: evaluate(tracks, truth, scope) for name, (tracks, truth) in sequences.items()}
    )
