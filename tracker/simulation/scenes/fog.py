"""Fog over the forecourt: the farther, the less is detected, and much that is not there."""

from __future__ import annotations

from tracker.simulation.scenes.scene import Scene
from tracker.simulation.sensors.camera import CameraSceneSettings, film
from tracker.simulation.sensors.clutter import ClutterSettings
from tracker.simulation.settings import DetectionSettings, NoiseSettings, ScoreSettings

SCENE = Scene(
    name="fog",
    summary="mast camera in fog: low detection probability, heavy clutter, overlapping scores",
    settings=CameraSceneSettings(
        detection=DetectionSettings(probability=0.8, size_half=45.0, miss_correlation_seconds=0.15),
        noise=NoiseSettings(position_sigma=0.06, size_sigma=0.09),
        scores=ScoreSettings(object_mean=0.7, clutter_mean=-0.3),
        clutter=ClutterSettings(per_frame=8.0, hotspots=5, hotspot_share=0.3),
    ),
    build=film,
)
