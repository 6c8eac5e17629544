"""What a run made of each annotated row."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tracker.evaluation.evaluate import Examined
from tracker.log.model import Ints

Mask = NDArray[np.bool_]


@dataclass(frozen=True, slots=True, eq=False)
class TruthRows:
    """The (T,) scored rows of the truth, in order of frame, then object.

    truth_row : rows of the truth's arrays.   frame : position among the frames.   paired : whether
    a track was on it (CLEAR MOT).   own : whether its object's own track was, the one that the
    identity metrics give it over the whole sequence.   switched : paired with another track than
    the object's last.   resumed : paired again after annotated rows that were not.
    """

    truth_row: Ints
    frame: Ints
    object: Ints
    paired: Mask
    own: Mask
    switched: Mask
    resumed: Mask


def truth_rows(found: Examined) -> TruthRows:
    """Look at each row of one scored sequence; sums over rows are its counts."""
    scene, match = found.counted.scene, found.counted.match
    pairs = np.diff(scene.pair_start)
    row = np.repeat(np.arange(len(match)), pairs)
    mine = found.counted.own_track[np.repeat(scene.truth, pairs)] == scene.track[scene.pair_row]
    own = np.zeros(len(match), np.bool_)
    own[row[mine]] = True
    switched, resumed = np.zeros_like(own), np.zeros_like(own)
    order = np.argsort(scene.truth, kind="stable")
    at = np.flatnonzero(match[order] >= 0)  # places in the order that are paired
    later = order[at]
    track = scene.track[scene.pair_row[match[later]]]
    same = scene.truth[later[1:]] == scene.truth[later[:-1]]
    switched[later[1:]] = same & (track[1:] != track[:-1])
    resumed[later[1:]] = same & (np.diff(at) > 1)
    frame = np.repeat(np.arange(len(scene.truth_start) - 1), np.diff(scene.truth_start))
    return TruthRows(found.both.truth_row, frame, scene.truth, match >= 0, own, switched, resumed)
