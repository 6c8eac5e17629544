"""Costs of a frame's candidates: named terms in nats, added up.

To add a term: a kernel in kernels/cost.py, a branch here, its name in settings/schema.py.
"""

from __future__ import annotations

import numpy as np

from tracker.association.rule import AssociationRule
from tracker.kernels.cost import likelihood_term, mahalanobis_term, overlap_term
from tracker.kernels.gate import Candidates
from tracker.log.model import Floats


def candidate_costs(rule: AssociationRule, candidates: Candidates) -> tuple[Floats, Floats]:
    """(T, E) terms in the order of ``rule.terms``, and (E,) their sum plus −ln P_D, in nats."""
    if len(rule.terms) == 1:
        term = _term(rule.terms[0], rule, candidates)
        return term[np.newaxis], term + rule.paid
    terms = np.empty((len(rule.terms), len(candidates.column)))
    for k, name in enumerate(rule.terms):
        terms[k] = _term(name, rule, candidates)
    return terms, terms.sum(axis=0) + rule.paid


def _term(name: str, rule: AssociationRule, candidates: Candidates) -> Floats:
    if name == "overlap":
        return overlap_term(candidates.overlap, rule.overlap_nats, rule.overlap_neutral)
    if name == "mahalanobis":
        return mahalanobis_term(candidates.distance, rule.threshold)
    return likelihood_term(
        candidates.distance, candidates.log_volume, rule.dimension, rule.log_new_density
    )
