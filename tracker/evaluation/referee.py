"""motmetrics as referee: an independent, published implementation of CLEAR MOT and ID metrics.

Its traps are kept out here: it gets our own distances (its IoU fails with numpy 2), ids as dense
small integers (it passes them through float), frames in order without repeats, a fixed solver, and
no empty input (which would give not-a-number).

It keeps every event of a sequence in lists and tables, and for the identity metrics dense matrices
of (objects + tracks)²: 5,000 frames of 200 objects with 5,300 tracks took 1.6 GB, 1,000 frames of
1,000 objects with 6,100 tracks 2.2 GB (`scripts/benchmark_evaluation.py`). Memory is the limit: on
a machine with 16 GB at about 20,000 objects and tracks or 25 million pairs that may match.
"""

from __future__ import annotations

import math
import warnings
from dataclasses import asdict

import numpy as np

from tracker.errors import InternalError, UsageError
from tracker.evaluation.scores import Counts
from tracker.kernels.clearmot import Scene

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

# Measured with motmetrics 1.4 and pandas 3, with some room.
BYTES_A_PAIR = 600
BYTES_A_SQUARE = 36  # of objects + tracks
LARGEST_BYTES = 16e9


def check(found: Counts, scene: Scene, sequence: str) -> None:
    """Raise InternalError if motmetrics counts otherwise; `scene` has the pairs that may match.

    Distances are compared up to rounding of their sum, counts exactly. Raises UsageError where
    motmetrics would need more than 16 GB.
    """
    identities = len(np.unique(scene.truth)) + len(np.unique(scene.track))
    needed = BYTES_A_PAIR * len(scene.pair_row) + BYTES_A_SQUARE * identities**2
    if needed > LARGEST_BYTES:
        raise UsageError(
            f"'{sequence}' is too large for the referee: motmetrics would need about "
            f"{needed / 1e9:.0f} GB for {identities} objects and tracks and "
            f"{len(scene.pair_row)} pairs that may match; leave it out with --referee off"
        )
    mine, theirs = asdict(found), asdict(referee_counts(scene))
    differ = [
        f"{name} {mine[name]} against {theirs[name]}"
        for name in mine
        if not (
            math.isclose(mine[name], theirs[name], rel_tol=1e-9, abs_tol=1e-9)
            if isinstance(mine[name], float)
            else mine[name] == theirs[name]
        )
    ]
    if differ:
        raise InternalError(
            f"'{sequence}': our counts and the referee's (motmetrics) differ: {', '.join(differ)}"
        )


def referee_counts(scene: Scene) -> Counts:
    """Count one sequence. Frames without any row are left out."""
    truth_boxes, track_boxes = len(scene.truth), len(scene.track)
    filled = np.flatnonzero(np.diff(scene.truth_start) + np.diff(scene.track_start))
    if not truth_boxes or not track_boxes:
        return _one_sided(len(filled), scene)
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # pandas' about motmetrics' code, nothing of ours
        import motmetrics as mm

        accumulator = mm.MOTAccumulator()
        with mm.lap.set_default_solver("scipy"):
            for number, f in enumerate(filled.tolist()):
                a, b = int(scene.truth_start[f]), int(scene.truth_start[f + 1])
                c, d = int(scene.track_start[f]), int(scene.track_start[f + 1])
                pairs = slice(int(scene.pair_start[a]), int(scene.pair_start[b]))
                distance = np.full((b - a, d - c), np.nan)
                row = np.repeat(np.arange(b - a), np.diff(scene.pair_start[a : b + 1]))
                distance[row, scene.pair_row[pairs] - c] = scene.distance[pairs]
                accumulator.update(
                    scene.truth[a:b].tolist(), scene.track[c:d].tolist(), distance, frameid=number
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


def _one_sided(frames: int, scene: Scene) -> Counts:
    """Nothing to pair: all annotated rows are missed, all reported rows are wrong."""
    objects = len(np.unique(scene.truth))
    truth_boxes, track_boxes = len(scene.truth), len(scene.track)
    return Counts(
        frames=frames,
        objects=objects,
        truth_boxes=truth_boxes,
        track_boxes=track_boxes,
        misses=truth_boxes,
        false_positives=track_boxes,
        mostly_lost=objects,
        identity_misses=truth_boxes,
        identity_false_positives=track_boxes,
    )
