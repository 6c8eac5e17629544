"""motmetrics as referee: an independent, published implementation of CLEAR MOT and ID metrics.

Its traps are kept out here: it gets our own distances (its IoU fails with numpy 2), ids as dense
small integers (it passes them through float), frames in order without repeats, a fixed solver, and
no empty input (which would give not-a-number).
"""

from __future__ import annotations

import warnings
from collections.abc import Iterable

import numpy as np

from tracker.evaluation.distance import distances
from tracker.evaluation.frames import FramePair
from tracker.evaluation.scope import Scope
from tracker.evaluation.scores import Counts
from tracker.log.model import Kind

METRICS = {
    "frames": "num_frames",
    "objects": "num_unique_objects",
    "truth_boxes": "num_objects",
    "track_boxes": "num_predictions",
    "matches": "num_detections",
    "switches": "num_switches",
    "false_positives": "num_false_positives",
    "misses": "num_misses",
    "fragmentations": "num_fragmentations",
    "mostly_tracked": "mostly_tracked",
    "partially_tracked": "partially_tracked",
    "mostly_lost": "mostly_lost",
    "identity_matches": "idtp",
    "identity_false_positives": "idfp",
    "identity_misses": "idfn",
}


def referee_counts(pairs: Iterable[FramePair], kind: Kind, scope: Scope) -> Counts:
    """Count one sequence. Frames come in order; frames without any row are left out."""
    filled = [pair for pair in pairs if len(pair.truth) or len(pair.track)]
    truth_boxes = sum(len(pair.truth) for pair in filled)
    track_boxes = sum(len(pair.track) for pair in filled)
    if not truth_boxes or not track_boxes:
        return _one_sided(filled, truth_boxes, track_boxes)
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # pandas' about motmetrics' code, nothing of ours
        import motmetrics as mm

        accumulator = mm.MOTAccumulator()
        identities = np.unique(np.concatenate([pair.track for pair in filled]))
        with mm.lap.set_default_solver("scipy"):
            for number, pair in enumerate(filled):
                accumulator.update(
                    pair.truth.tolist(),
                    np.searchsorted(identities, pair.track).tolist(),
                    distances(pair, kind, scope.iou_threshold, scope.distance_threshold),
                    frameid=number,
                )
            found = mm.metrics.create().compute(
                accumulator,
                metrics=[*METRICS.values(), "motp"],
                return_dataframe=False,
            )
    values = {ours: int(found[theirs]) for ours, theirs in METRICS.items()}
    matches = values["matches"]
    distance_sum = float(found["motp"]) * matches if matches else 0.0
    return Counts(**values, distance_sum=distance_sum)


def _one_sided(pairs: list[FramePair], truth_boxes: int, track_boxes: int) -> Counts:
    """Nothing to pair: all annotated rows are missed, all reported rows are wrong."""
    objects = len({identity for pair in pairs for identity in pair.truth.tolist()})
    return Counts(
        frames=len(pairs),
        objects=objects,
        truth_boxes=truth_boxes,
        track_boxes=track_boxes,
        misses=truth_boxes,
        false_positives=track_boxes,
        mostly_lost=objects,
        identity_misses=truth_boxes,
        identity_false_positives=track_boxes,
    )
