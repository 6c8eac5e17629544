"""Gate, cost, assignment: who belongs to whom in one frame, and the proof of it."""

from tracker.association.associate import TierDecision, associate
from tracker.association.marginals import marginals
from tracker.association.pairs import CandidatePairs
from tracker.association.ranking import k_best
from tracker.association.rule import AssociationRule
from tracker.association.terms import register_cost

__all__ = [
    "AssociationRule",
    "CandidatePairs",
    "TierDecision",
    "associate",
    "k_best",
    "marginals",
    "register_cost",
]
