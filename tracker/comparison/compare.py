"""Compare two runs over the same sequences and truth."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

from tracker.comparison.blocks import BLOCK_SECONDS, ENOUGH_SEQUENCES, clock_of, sum_blocks
from tracker.comparison.bootstrap import (
    Resampling,
    check_resampling,
    interval,
    resample,
    share_above,
    units_needed,
)
from tracker.comparison.model import COMPARED, LOWER_BETTER, Change, Comparison
from tracker.comparison.objects import ObjectChange, object_changes
from tracker.comparison.parting import Parting, find_parting
from tracker.comparison.parts import COLUMNS, OF_OBJECTS, frame_parts
from tracker.comparison.rows import truth_rows
from tracker.evaluation.evaluate import Evaluation, check_choices, examine, scope_of_each
from tracker.evaluation.processes import in_processes
from tracker.evaluation.scope import Scope
from tracker.evaluation.scores import Scores
from tracker.log.model import Floats, Truth
from tracker.results.tracks import Tracks

RESAMPLES = 2000
CONFIDENCE = 0.95


@dataclass(frozen=True, slots=True, eq=False)
class _Sequence:
    """One compared sequence; blocks : (U, COLUMNS) sums of A and of B."""

    scores: tuple[Scores, Scores]
    blocks: tuple[Floats, Floats]
    objects: list[ObjectChange]
    parting: Parting


def compare(
    sequences: Mapping[str, tuple[Tracks, Tracks, Truth]],
    scope: Scope | Mapping[str, Scope] | None = None,
    *,
    block_seconds: float | None = None,
    resamples: int = RESAMPLES,
    confidence: float = CONFIDENCE,
    seed: int = 0,
    with_referee: bool = True,
    workers: int = 1,
    watch: Callable[[Iterable[Any], int], Iterable[Any]] | None = None,
) -> Comparison:
    """Compare runs A and B: (tracks of A, tracks of B, truth) of each sequence by name.

    block_seconds : length of the blocks of time that are resampled. None resamples whole
    sequences where there are eight or more, else blocks of 5 s.   resamples, confidence, seed : of
    the bootstrap.   The others are as in `evaluate_all`.

    Raises what `evaluate_all` raises, and UsageError for numbers that make no sense.
    """
    check_resampling(resamples, confidence, block_seconds)
    scopes = scope_of_each(scope, sequences)
    check_choices([truth for _, _, truth in sequences.values()], scopes.values())
    by_sequence = block_seconds is None and len(sequences) >= ENOUGH_SEQUENCES
    seconds = block_seconds or BLOCK_SECONDS
    jobs = {
        name: (name, *parts, scopes[name], with_referee, seconds)
        for name, parts in sequences.items()
    }
    finished = in_processes(_compare_one, jobs, workers)
    found: dict[str, _Sequence] = dict(watch(finished, len(jobs)) if watch else finished)
    a, b = (Evaluation({name: item.scores[k] for name, item in found.items()}) for k in range(2))
    units = [_units([item.blocks[k] for item in found.values()], by_sequence) for k in range(2)]
    plan = Resampling(
        "sequence" if by_sequence else "block",
        len(units[0]),
        None if by_sequence else seconds,
        resamples,
        confidence,
        seed,
    )
    overall = _changes(a.overall, b.overall)
    enough = plan.units >= units_needed(confidence)
    if enough:
        overall = _with_intervals(overall, (units[0], units[1]), a.overall, plan)
    return Comparison(
        a,
        b,
        overall,
        {name: _changes(*item.scores) for name, item in found.items()},
        tuple(change for item in found.values() for change in item.objects),
        {name: item.parting for name, item in found.items()},
        plan if enough else None,
        tuple(_notes(plan)),
    )


def _compare_one(
    name: str,
    a: Tracks,
    b: Tracks,
    truth: Truth,
    scope: Scope,
    with_referee: bool,
    block_seconds: float,
) -> _Sequence:
    examined = [examine(tracks, truth, scope, with_referee=with_referee) for tracks in (a, b)]
    rows = [truth_rows(found) for found in examined]
    parts = [frame_parts(found, seen) for found, seen in zip(examined, rows, strict=True)]
    seconds = [clock_of(found, truth, (a, b)).at(found.both.numbers) for found in examined]
    return _Sequence(
        (examined[0].scores, examined[1].scores),
        sum_blocks(seconds, parts, block_seconds),
        object_changes(name, truth, examined[0].both.numbers, (rows[0], rows[1])),
        find_parting(a, b, scope.for_truth(truth)),
    )


def _units(blocks: list[Floats], by_sequence: bool) -> Floats:
    """(U, COLUMNS) what is drawn from."""
    if by_sequence:
        return np.array([part.sum(axis=0) for part in blocks])
    return np.concatenate(blocks) if blocks else np.zeros((0, COLUMNS))


def _changes(a: Scores, b: Scores) -> dict[str, Change]:
    out = {}
    for name in COMPARED:
        one, other = a.value(name), b.value(name)
        difference = None if one is None or other is None else other - one
        out[name] = Change(name, one, other, difference)
    return out


def _with_intervals(
    changes: dict[str, Change], units: tuple[Floats, Floats], scores: Scores, plan: Resampling
) -> dict[str, Change]:
    names = list(changes)
    values_a, values_b = resample(units, names, scores.kinds, plan)
    out = {}
    for k, (name, change) in enumerate(changes.items()):
        gain = values_b[:, k] - values_a[:, k]
        known = change.difference is not None and (
            plan.unit == "sequence" or name not in OF_OBJECTS
        )
        ends = interval(gain, plan.confidence, plan.units) if known else None
        if ends is None:
            out[name] = change
            continue
        better = share_above(-gain if name in LOWER_BETTER else gain)
        out[name] = Change(name, change.a, change.b, change.difference, *ends, better)
    return out


def _notes(plan: Resampling) -> Iterable[str]:
    sequences = plan.unit == "sequence"
    what = "sequences" if sequences else f"blocks of {plan.block_seconds:g} s"
    needed = units_needed(plan.confidence)
    if plan.units < needed:
        yield (
            f"no intervals: {plan.units} {what} cannot show a difference at "
            f"{100 * plan.confidence:g}% confidence, it takes {needed}; give more sequences, or a "
            "--block-seconds that is still longer than errors last"
        )
    elif plan.units < ENOUGH_SEQUENCES:
        yield (
            f"only {plan.units} {what} to draw from: take the intervals as a rough guide; more "
            "sequences make better ones"
        )
