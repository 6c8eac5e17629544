"""Costs of a frame's candidates: named terms in nats, added up."""

from __future__ import annotations

import numpy as np

from tracker.association.pairs import CandidatePairs
from tracker.association.rule import AssociationRule
from tracker.association.terms import evaluate_term
from tracker.log.model import Floats


def candidate_costs(
    rule: AssociationRule, pairs: CandidatePairs, detected: Floats | None
) -> tuple[Floats, Floats]:
    """(T, E) terms in the order of ``rule.terms``, and (E,) their sum plus −ln P_D, in nats.

    detected : (E,) P_D of the track of each pair, None for that of the rule.
    Raises what `evaluate_term` raises.
    """
    paid = -np.log(rule.detected if detected is None else detected)
    if len(rule.terms) == 1:
        term = _term(rule.terms[0], rule, pairs)
        return term[np.newaxis], term + paid
    terms = np.empty((len(rule.terms), len(pairs)))
    for k, name in enumerate(rule.terms):
        terms[k] = _term(name, rule, pairs)
    return terms, terms.sum(axis=0) + paid


def _term(name: str, rule: AssociationRule, pairs: CandidatePairs) -> Floats:
    return evaluate_term(name, pairs, rule.cost, rule.threshold, rule.boxes, rule.log_new_density)
