"""`simulate`: a scene, a seed and settings in, detections with truth out."""

from __future__ import annotations

import difflib

from tracker.errors import UsageError
from tracker.simulation.scenes import SCENES, Scene
from tracker.simulation.sequence import SimulatedSequence
from tracker.simulation.settings import SceneSettings
from tracker.simulation.streams import Streams


def find_scene(name: str) -> Scene:
    """The scene of this name. Raises UsageError with the names there are."""
    if name in SCENES:
        return SCENES[name]
    near = difflib.get_close_matches(name, SCENES, n=1, cutoff=0.5)
    hint = f"; did you mean '{near[0]}'?" if near else ""
    raise UsageError(f"there is no scene '{name}' (there are {', '.join(SCENES)}){hint}")


def simulate(scene: str, *, seed: int, settings: SceneSettings | None = None) -> SimulatedSequence:
    """Simulate one scene of Tern Quay, without writing anything.

    The same scene, seed and settings give the same numbers. Each component (arrivals, walking,
    detection, noise, clutter, ...) has random numbers of its own, so that changing one leaves
    the others as they were.

    Parameters
    ----------
    scene : one of `SCENES`.   seed : 0 or greater.
    settings : of the scene's own type (``SCENES[scene].settings``), which is the default.

    Raises UsageError for an unknown scene, settings of another scene or a negative seed.
    """
    chosen = find_scene(scene)
    if settings is None:
        settings = chosen.settings
    elif type(settings) is not type(chosen.settings):
        wanted, found = type(chosen.settings).__name__, type(settings).__name__
        raise UsageError(f"scene '{scene}' takes settings of type {wanted}, found {found}")
    return chosen.build(scene, settings, Streams(seed))
