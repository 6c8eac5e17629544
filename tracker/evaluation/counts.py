"""Count one sequence with our own compiled counters."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from tracker.evaluation.clearmot import lifetimes, pair_frames
from tracker.evaluation.couples import Couples
from tracker.evaluation.frames import SideBySide
from tracker.evaluation.identity import identity_matches
from tracker.evaluation.scores import Counts


def count(both: SideBySide, couples: Couples, close: NDArray[np.bool_]) -> Counts:
    """CLEAR MOT and identity counts.

    close : (E,) which pairs are close enough for them.
    """
    scene = both.only_pairs(close)
    match = pair_frames(scene, both.objects)
    lives = lifetimes(scene, match, both.objects)
    paired = match >= 0
    truth_boxes, track_boxes, matches = len(match), len(both.track_row), int(paired.sum())
    share = lives.paired / lives.rows
    shared = np.bincount(couples.of_pair[close], minlength=len(couples))
    identity = identity_matches(couples, shared, both.objects)
    rows = np.diff(scene.truth_start) + np.diff(scene.track_start)
    return Counts(
        frames=int(np.count_nonzero(rows)),
        objects=both.objects,
        truth_boxes=truth_boxes,
        track_boxes=track_boxes,
        matches=matches,
        switches=int(lives.switches.sum()),
        false_positives=track_boxes - matches,
        misses=truth_boxes - matches,
        fragmentations=int(lives.gaps.sum()),
        mostly_tracked=int(np.sum(share >= 0.8)),
        partially_tracked=int(np.sum((share >= 0.2) & (share < 0.8))),
        mostly_lost=int(np.sum(share < 0.2)),
        distance_sum=float(scene.distance[match[paired]].sum()),
        identity_matches=identity,
        identity_false_positives=track_boxes - identity,
        identity_misses=truth_boxes - identity,
    )
