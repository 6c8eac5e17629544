"""Score tracks against truth, one sequence or several."""

from __future__ import annotations

import difflib
from collections.abc import Callable, Collection, Iterable, Mapping, Sequence
from dataclasses import dataclass, field, replace
from typing import Any

import numpy as np

from tracker.errors import UsageError
from tracker.evaluation import referee
from tracker.evaluation.counts import Counted, count
from tracker.evaluation.couples import Couples, find_couples
from tracker.evaluation.durations import measure_durations
from tracker.evaluation.frames import SideBySide
from tracker.evaluation.hota import count_hota
from tracker.evaluation.processes import in_processes
from tracker.evaluation.scope import Scope, close_pairs, scored_rows
from tracker.evaluation.scores import Scores
from tracker.evaluation.set_distance import measure_sets
from tracker.log.model import Kind, Truth
from tracker.results.tracks import Tracks


@dataclass(frozen=True, slots=True)
class Evaluation:
    """Scores of several sequences; `overall` comes from their summed counts, and so do those of
    each class (none unless asked for)."""

    sequences: dict[str, Scores]
    classes: dict[str, Scores] = field(default_factory=dict)

    @property
    def overall(self) -> Scores:
        return Scores.total(self.sequences.values())

    def as_dict(self) -> dict[str, Any]:
        """What `margent evaluate --json` prints."""
        parts = {"sequences": self.sequences} | ({"classes": self.classes} if self.classes else {})
        return {"overall": self.overall.as_dict()} | {
            part: {name: scores.as_dict() for name, scores in found.items()}
            for part, found in parts.items()
        }


@dataclass(frozen=True, slots=True, eq=False)
class Examined:
    """One scored sequence with what its scores were made of."""

    both: SideBySide
    couples: Couples
    counted: Counted
    cut_off: float
    scores: Scores


def evaluate(
    tracks: Tracks, truth: Truth, scope: Scope | None = None, *, with_referee: bool = True
) -> Scores:
    """Score one sequence: CLEAR MOT, identity metrics, HOTA, GOSPA and OSPA, durations.

    with_referee : whether motmetrics counts too and has to agree.

    Raises UsageError where tracks and truth do not fit together, InputError where a track or
    object is twice in a frame, InternalError where the referee counts otherwise.
    """
    return examine(tracks, truth, scope, with_referee=with_referee).scores


def examine(
    tracks: Tracks, truth: Truth, scope: Scope | None = None, *, with_referee: bool = True
) -> Examined:
    """As `evaluate`, keeping what the scores were made of."""
    scope = scope or Scope()
    both = scored_rows(tracks, truth, scope)
    close = close_pairs(both, truth.kind, scope)
    couples = find_couples(both)
    found = count(both, couples, close)
    if with_referee:
        referee.check(found.counts, found.scene, tracks.name)
    cut_off = _cut_off(truth.kind, scope)
    scores = Scores(
        found.counts,
        count_hota(both, couples),
        measure_sets(found.scene, cut_off),
        measure_durations(found.scene, found.match, found.own_track, both.tracks),
        frozenset({truth.kind}),
    )
    return Examined(both, couples, found, cut_off, scores)


def _cut_off(kind: Kind, scope: Scope) -> float:
    """Largest distance of a pair."""
    return (scope.distance_threshold or 0.0) if kind is Kind.POINT else 1.0 - scope.iou_threshold


def evaluate_classes(
    tracks: Tracks, truth: Truth, scope: Scope | None = None, *, with_referee: bool = True
) -> dict[str, Scores]:
    """Score each class of the truth on its own, by label.

    The other classes are ignored meanwhile, and tracks that have the label of one of them are
    left out: a track with the wrong label is a miss of the right class. Raises as `evaluate`.
    """
    scope = (scope or Scope()).for_truth(truth)
    found = {}
    for label in truth.labels:
        if label in scope.classes_ignored or label not in (scope.classes_scored or truth.labels):
            continue
        others = tuple(other for other in truth.labels if other != label)
        alone = replace(
            scope, classes_scored=(label,), classes_ignored=others, track_classes_left_out=others
        )
        found[label] = evaluate(tracks, truth, alone, with_referee=with_referee)
    return found


def evaluate_all(
    sequences: Mapping[str, tuple[Tracks, Truth]],
    scope: Scope | Mapping[str, Scope] | None = None,
    *,
    with_referee: bool = True,
    per_class: bool = False,
    workers: int = 1,
    watch: Callable[[Iterable[Any], int], Iterable[Any]] | None = None,
) -> Evaluation:
    """Score several sequences by name.

    scope : of all, or of each by name.   workers : processes; each takes whole sequences, and the
    scores do not depend on how many there are.   watch : wraps the finished sequences and their
    number, to show progress.

    Raises what `evaluate` raises, and UsageError for choices that no truth can follow: classes that
    none has, scores per class or a visibility floor without such a column.
    """
    scopes = scope_of_each(scope, sequences)
    check_choices([truth for _, truth in sequences.values()], scopes.values(), per_class)
    jobs = {
        name: (tracks, truth, scopes[name], with_referee, per_class)
        for name, (tracks, truth) in sequences.items()
    }
    finished = in_processes(_evaluate_one, jobs, workers)
    found: dict[str, Found] = dict(watch(finished, len(jobs)) if watch else finished)
    labels = dict.fromkeys(label for _, classes in found.values() for label in classes)
    return Evaluation(
        {name: scores for name, (scores, _) in found.items()},
        {
            label: Scores.total(classes[label] for _, classes in found.values() if label in classes)
            for label in sorted(labels)
        },
    )


Found = tuple[Scores, dict[str, Scores]]


def _evaluate_one(
    tracks: Tracks, truth: Truth, scope: Scope, with_referee: bool, per_class: bool
) -> Found:
    scores = evaluate(tracks, truth, scope, with_referee=with_referee)
    if not per_class:
        return scores, {}
    return scores, evaluate_classes(tracks, truth, scope, with_referee=with_referee)


def scope_of_each(
    scope: Scope | Mapping[str, Scope] | None, names: Iterable[str]
) -> dict[str, Scope]:
    """The scope of each sequence by name, from one for all or one of each."""
    return {
        name: (scope.get(name) if isinstance(scope, Mapping) else scope) or Scope()
        for name in names
    }


def check_choices(
    truths: Sequence[Truth], scopes: Collection[Scope], per_class: bool = False
) -> None:
    """A choice that no truth can follow is a slip, and would silently do nothing or too much.

    Truth without a row could follow any.
    """
    filled = [truth for truth in truths if len(truth)]
    if not filled:
        return
    known = sorted({label for truth in filled for label in truth.labels})
    for scope in scopes:
        for label in (*(scope.classes_scored or ()), *scope.classes_ignored):
            if label not in known:
                near = difflib.get_close_matches(label, known, n=1, cutoff=0.5)
                hint = f"; did you mean '{near[0]}'?" if near else ""
                there = f"there are {', '.join(known)}" if known else "it has no classes"
                raise UsageError(f"no truth has the class '{label}' ({there}){hint}")
    if per_class and not known:
        raise UsageError("there are no scores per class: no truth has a column 'label'")
    floor = any(scope.visibility_floor is not None for scope in scopes)
    if floor and all(np.isnan(truth.visibility).all() for truth in filled):
        raise UsageError("there is no visibility to compare: no truth has a column 'visibility'")
