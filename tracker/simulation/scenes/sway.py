"""Wind: the mast sways, and the camera pans, tilts, rolls and breathes with it."""

from __future__ import annotations

from tracker.simulation.scenes.scene import Scene
from tracker.simulation.sensors.camera import CameraSceneSettings, film
from tracker.simulation.sensors.sway import SwaySettings

SCENE = Scene(
    name="sway",
    summary="mast camera in the wind: pan, tilt, roll and zoom move; camera.csv has the truth",
    settings=CameraSceneSettings(
        sway=SwaySettings(
            pan_sigma_degrees=1.5,
            tilt_sigma_degrees=0.8,
            roll_sigma_degrees=0.8,
            zoom_sigma=0.006,
            frequency_hz=0.7,
            bandwidth_hz=0.2,
        ),
    ),
    build=film,
)
