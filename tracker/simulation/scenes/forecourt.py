"""An ordinary afternoon on the forecourt: people, bicycles and luggage carts."""

from __future__ import annotations

from tracker.simulation.camera import CameraSceneSettings, film
from tracker.simulation.scenes.scene import Scene

SCENE = Scene(
    name="forecourt",
    summary="mast camera: people, bicycles and luggage carts, groups, stop-and-go, occlusion",
    settings=CameraSceneSettings(),
    build=film,
)
