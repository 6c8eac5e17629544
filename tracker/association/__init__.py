"""Gate, cost, assignment: who belongs to whom in one frame, and the proof of it."""

from tracker.association.associate import TierDecision, associate
from tracker.association.rule import AssociationRule

__all__ = ["AssociationRule", "TierDecision", "associate"]
