"""Seeded scenes of Tern Quay with truth.

sequence = simulate("forecourt", seed=7)
log, truth = sequence.log(), sequence.truth()
"""

from tracker.simulation.scenes import SCENES, Scene
from tracker.simulation.sequence import CLUTTER, SimulatedSequence
from tracker.simulation.simulate import find_scene, simulate
from tracker.simulation.writing import write_sequence

__all__ = [
    "CLUTTER",
    "SCENES",
    "Scene",
    "SimulatedSequence",
    "find_scene",
    "simulate",
    "write_sequence",
]
