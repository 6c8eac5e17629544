"""Motion models: how states move, and how detections correct them."""

from __future__ import annotations

from tracker.log.model import Kind
from tracker.motion.constant_velocity import ConstantVelocity
from tracker.settings.schema import Settings

__all__ = ["ConstantVelocity", "motion_model"]


def motion_model(settings: Settings, kind: Kind) -> ConstantVelocity:
    """The motion model that the settings ask for."""
    return ConstantVelocity(settings, kind)
