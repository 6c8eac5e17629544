"""The loading yard from the roof: forklifts and straddle carriers that turn, stop and reverse."""

from __future__ import annotations

from tracker.simulation.scenes.scene import Scene
from tracker.simulation.sensors.lidar import YardSettings, scan_yard

SCENE = Scene(
    name="yard",
    summary="roof lidar: forklifts and straddle carriers as oriented boxes, turning and reversing",
    settings=YardSettings(),
    build=scan_yard,
)
