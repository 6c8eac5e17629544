"""Slow twin of kernels/elimination.py."""

from tests.reference.marginals import marginals


def exact_marginals(allowed, cost, miss, new):
    """Probabilities of pairs, misses and new columns, by listing all events."""
    return marginals(allowed, cost, miss, new)
