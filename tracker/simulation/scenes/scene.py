"""What a scene is: a name, default settings, and how to build it."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

from tracker.simulation.sequence import SimulatedSequence
from tracker.simulation.settings import SceneSettings
from tracker.simulation.streams import Streams


@dataclass(frozen=True, slots=True)
class Scene:
    """A scene of Tern Quay. `build` takes its name, settings of the type of `settings`, streams."""

    name: str
    summary: str
    settings: SceneSettings
    build: Callable[[str, Any, Streams], SimulatedSequence]
