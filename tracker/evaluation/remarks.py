"""What a person should know beside the scores: rows left out, defaults taken, signs of a mix-up."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence

from tracker.evaluation.scope import Scope
from tracker.evaluation.scores import Scores
from tracker.log.model import Truth
from tracker.log.sieve import sentence

LISTED = 5  # rejected rows that are shown; more would bury the scores


def remarks(truth: Truth, scope: Scope, scores: Scores) -> Iterator[str]:
    """Sentences about one scored sequence, the most serious last."""
    used, counts = scope.for_truth(truth), scores.counts
    for note in truth.notes:
        yield f"note: {note}"
    if used != scope:
        yield (
            f"note: class {', '.join(used.classes_scored or ())} is scored and classes "
            f"{', '.join(used.classes_ignored)} are ignored, the default of the public benchmark "
            "layout; --score-class and --ignore-class choose others"
        )
    if truth.rejections:
        number = len(truth.rejections)
        yield (
            f"{number} {'row' if number == 1 else 'rows'} of {truth.path} rejected and not scored "
            "(--strict stops instead):"
        )
        for row in truth.rejections[:LISTED]:
            yield f"  {sentence(row)}"
        if number > LISTED:
            yield f"  and {number - LISTED} more"
    if len(truth) and not counts.truth_boxes:
        classes = f" (its classes: {', '.join(truth.labels)})" if truth.labels else ""
        yield f"note: no row of the truth is scored{classes}, so every track row counts as false"
    if counts.truth_boxes and counts.track_boxes and not counts.matches:
        yield (
            "note: no track is ever on an object; are frame numbers and coordinates those of this "
            "truth?"
        )


def told_once(said: Mapping[str, Sequence[str]]) -> Iterator[str]:
    """The sentences about each sequence with its name; what is said of all of them once."""
    common = [
        text for text in next(iter(said.values()), ()) if all(text in own for own in said.values())
    ]
    if len(said) > 1:
        yield from (f"all sequences: {text}" for text in common)
    for name, own in said.items():
        yield from (f"{name}: {text}" for text in own if len(said) == 1 or text not in common)
