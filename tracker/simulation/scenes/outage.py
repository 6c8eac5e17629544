"""A bad line: frames get lost alone and in runs, clocks jitter, and some data comes late."""

from __future__ import annotations

from tracker.simulation.scenes.scene import Scene
from tracker.simulation.sensors.camera import CameraSceneSettings, film
from tracker.simulation.settings import DeliverySettings

SCENE = Scene(
    name="outage",
    summary="mast camera on a bad line: lost frames, outages, jittered times, late arrivals",
    settings=CameraSceneSettings(
        delivery=DeliverySettings(
            outages_per_minute=12.0,
            outage_seconds=0.8,
            drop_probability=0.05,
            jitter_sigma_seconds=0.01,
            latency_seconds=0.05,
            late_probability=0.1,
            late_seconds=0.25,
        ),
    ),
    build=film,
)
