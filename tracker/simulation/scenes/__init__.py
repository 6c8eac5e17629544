"""The scenes of Tern Quay, one file a scene."""

from tracker.simulation.scenes import fog, forecourt, outage, rush, sway
from tracker.simulation.scenes.scene import Scene

SCENES: dict[str, Scene] = {
    module.SCENE.name: module.SCENE
    for module in (forecourt, rush, fog, sway, outage)
}

__all__ = ["SCENES", "Scene"]
