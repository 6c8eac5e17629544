"""The ferry has just landed: a dense crowd in which people hide each other."""

from __future__ import annotations

from tracker.simulation.scenes.scene import Scene
from tracker.simulation.sensors.camera import CameraSceneSettings, film
from tracker.simulation.sensors.clutter import ClutterSettings
from tracker.simulation.settings import DetectionSettings
from tracker.simulation.world.site import TrafficSettings

SCENE = Scene(
    name="rush",
    summary="mast camera: a dense crowd in which people hide each other",
    settings=CameraSceneSettings(
        traffic=TrafficSettings(
            arrivals_per_minute=85.0,
            bicycle_share=0.03,
            cart_share=0.06,
            group_share=0.4,
            stops_mean=0.5,
        ),
        detection=DetectionSettings(probability=0.95, miss_correlation_seconds=0.2),
        clutter=ClutterSettings(per_frame=2.0),
    ),
    build=film,
)
