"""Any number of objects at constant density, for measuring how the work grows."""

from __future__ import annotations

from tracker.simulation.field import ScaleSettings, watch_field
from tracker.simulation.scenes.scene import Scene

SCENE = Scene(
    name="scale",
    summary="any number of objects at constant density, boxes or points (drift.objects=10000)",
    settings=ScaleSettings(),
    build=watch_field,
)
