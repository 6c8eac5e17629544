"""Count one sequence with our own compiled counters."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tracker.evaluation.clearmot import lifetimes, pair_frames
from tracker.evaluation.couples import Couples
from tracker.evaluation.frames import SideBySide
from tracker.evaluation.identity import own_tracks
from tracker.evaluation.scores import Counts
from tracker.kernels.clearmot import Scene
from tracker.log.model import Ints


@dataclass(frozen=True, slots=True, eq=False)
class Counted:
    """scene : with the pairs that were allowed.   match : (T,) pair of each annotated row, -1 for
    none.   own_track : (O,) track of each object by the identity metrics, -1 for none.
    """

    counts: Counts
    scene: Scene
    match: Ints
    own_track: Ints


def count(both: SideBySide, couples: Couples, close: NDArray[np.bool_]) -> Counted:
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
    own_track, identity = own_tracks(couples, shared, both.objects)
    rows = np.diff(scene.truth_start) + np.diff(scene.track_start)
    counts = Counts(
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
    return Counted(counts, scene, match, own_track)
