"""The scenes of Tern Quay, one file a scene."""

from tracker.simulation.scenes import fog, forecourt, harbour, outage, rush, scale, sway, yard
from tracker.simulation.scenes.scene import Scene

SCENES: dict[str, Scene] = {
    module.SCENE.name: module.SCENE
    for module in (forecourt, rush, fog, yard, harbour, sway, outage, scale)
}

__all__ = ["SCENES", "Scene"]
