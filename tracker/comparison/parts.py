"""Counts of stretches of time: columns that add up, and the scores that sums of them make.

Everything that happens in a frame is counted there, with the pairings of the whole sequence: the
identity metrics and HOTA match objects and tracks globally, so a stretch scored on its own would
be matched otherwise and its counts would not add up. Here IDTP, IDFP and IDFN are counted frame by
frame under the global matching, and every true positive of HOTA brings its A(c) along. What
belongs to an object as a whole (the object itself, mostly tracked and lost) is counted in its first
annotated frame, so that it adds up; blocks of time say nothing about how sure it is.
"""

from __future__ import annotations

from dataclasses import fields
from typing import Any

import numpy as np

from tracker.comparison.rows import TruthRows
from tracker.evaluation.clearmot import lifetimes
from tracker.evaluation.durations import Durations
from tracker.evaluation.evaluate import Examined
from tracker.evaluation.hota import THRESHOLDS, HotaCounts, count_hota_by_frame
from tracker.evaluation.scores import Counts, Scores
from tracker.evaluation.set_distance import SetDistances, sets_by_frame
from tracker.log.model import Floats, Ints, Kind

COUNTS = tuple(item.name for item in fields(Counts))
WHOLE = tuple(isinstance(item.default, int) for item in fields(Counts))
OF_OBJECTS = ("objects", "mostly_tracked", "partially_tracked", "mostly_lost")
_K = len(THRESHOLDS)
# Columns: the fields of `Counts`, then hits, association, similarity of HOTA, then `SetDistances`.
ENDS = np.cumsum([len(COUNTS), _K, _K, _K])
COLUMNS = int(ENDS[-1]) + len(fields(SetDistances))


def frame_parts(found: Examined, rows: TruthRows) -> Floats:
    """(F, COLUMNS) what each frame adds to the counts of one scored sequence."""
    scene, match = found.counted.scene, found.counted.match
    truth, track = np.diff(scene.truth_start), np.diff(scene.track_start)
    frames = len(truth)

    def a_frame(wanted: np.ndarray) -> Ints:
        return np.bincount(rows.frame[wanted], minlength=frames)

    lives = lifetimes(scene, match, found.both.objects)
    share = lives.paired / lives.rows
    first = np.unique(scene.truth, return_index=True)[1]
    matches, identity = a_frame(rows.paired), a_frame(rows.own)
    apart = scene.distance[match[rows.paired]]
    columns = {
        "frames": truth + track > 0,
        "objects": a_frame(first),
        "truth_boxes": truth,
        "track_boxes": track,
        "matches": matches,
        "switches": a_frame(rows.switched),
        "false_positives": track - matches,
        "misses": truth - matches,
        "fragmentations": a_frame(rows.resumed),
        "mostly_tracked": a_frame(first[share >= 0.8]),
        "partially_tracked": a_frame(first[(share >= 0.2) & (share < 0.8)]),
        "mostly_lost": a_frame(first[share < 0.2]),
        "distance_sum": np.bincount(rows.frame[rows.paired], apart, minlength=frames),
        "identity_matches": identity,
        "identity_false_positives": track - identity,
        "identity_misses": truth - identity,
    }
    return np.column_stack(
        [
            *(columns[name] for name in COUNTS),
            *count_hota_by_frame(found.both, found.couples),
            sets_by_frame(scene, found.cut_off),
        ]
    ).astype(np.float64)


def scores_of(values: Floats, kinds: frozenset[Kind]) -> Scores:
    """The scores of (COLUMNS,) summed parts; without durations, which do not add up so."""
    counts, hits, association, similarity, sets = np.split(values, ENDS)
    given: dict[str, Any] = {
        name: int(value) if whole else float(value)
        for name, value, whole in zip(COUNTS, counts, WHOLE, strict=True)
    }
    numbers = Counts(**given)
    return Scores(
        numbers,
        HotaCounts(
            numbers.truth_boxes,
            numbers.track_boxes,
            hits.astype(np.int64),
            association,
            similarity,
        ),
        SetDistances(int(sets[0]), *sets[1:].tolist()),
        Durations.none(),
        kinds,
    )
