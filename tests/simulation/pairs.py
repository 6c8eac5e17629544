"""Which true object each detection came from."""

from __future__ import annotations

import numpy as np

from tracker.log.model import Floats, Ints
from tracker.simulation import CLUTTER, SCENES, SimulatedSequence
from tracker.simulation.overrides import scene_settings


def pairs(sequence: SimulatedSequence) -> tuple[Ints, Ints]:
    """Rows (detection, truth) of every detection that is not clutter."""
    found, true = sequence.detections, sequence.objects
    row = {
        key: k for k, key in enumerate(zip(true.frame.tolist(), true.object.tolist(), strict=True))
    }
    rows = np.flatnonzero(found.origin != CLUTTER)
    keys = zip(found.frame[rows].tolist(), found.origin[rows].tolist(), strict=True)
    return rows, np.array([row[key] for key in keys])


def settings(scene: str, *texts: str):
    """A scene's settings with changes like those of --set."""
    return scene_settings(SCENES[scene].settings, None, texts)


def filter_order(sequence: SimulatedSequence) -> tuple[Floats, Floats]:
    """Measured and true values of all paired detections, boxes as centre and size."""
    detection, true = pairs(sequence)
    return sequence.log().z[detection], sequence.truth().z[true]
