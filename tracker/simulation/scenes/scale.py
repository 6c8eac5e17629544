"""Any number of objects at constant density, for measuring how the work grows."""

from __future__ import annotations

from tracker.simulation.scenes.scene import Scene
from tracker.simulation.sensors.field import ScaleSettings, watch_field

SCENE = Scene(
    name="scale",
    summary="any number of objects at constant density, boxes or points (drift.objects=10000)",
    settings=ScaleSettings(),
    build=watch_field,
)
