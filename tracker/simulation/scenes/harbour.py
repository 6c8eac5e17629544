"""The approach to the quay under the harbour radar: manoeuvring boats and sea clutter."""

from __future__ import annotations

from tracker.simulation.scenes.scene import Scene
from tracker.simulation.sensors.radar import HarbourSettings, scan_harbour

SCENE = Scene(
    name="harbour",
    summary="radar: range, azimuth and range rate of manoeuvring boats in sea clutter",
    settings=HarbourSettings(),
    build=scan_harbour,
)
