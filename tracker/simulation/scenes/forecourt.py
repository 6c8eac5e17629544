"""An ordinary afternoon on the forecourt: people, bicycles and luggage carts."""

from __future__ import annotations

from tracker.simulation.scenes.scene import Scene
from tracker.simulation.sensors.camera import CameraSceneSettings, film

SCENE = Scene(
    name="forecourt",
    summary="mast camera: people, bicycles and luggage carts, groups, stop-and-go, occlusion",
    settings=CameraSceneSettings(),
    build=film,
)
