"""Slow twins of kernels/marginals.py: probabilities added up over a list of all events."""

import numpy as np

from tests.reference.murty import all_events, event_cost


def marginals(allowed, cost, miss, new, best=None):
    """(n, m), (n,), (m,) probabilities of pairs, misses and new columns.

    best : if given, only so many of the cheapest events count.
    """
    events = all_events(allowed)
    costs = np.array([event_cost(cost, miss, new, event) for event in events], float)
    order = np.argsort(costs, kind="stable")[:best]
    weight = np.exp(costs[order[0]] - costs[order])
    weight /= weight.sum()
    pair, missed, unpaired = np.zeros(allowed.shape), np.zeros(len(miss)), np.zeros(len(new))
    for k, share in zip(order, weight, strict=True):
        for i, j in enumerate(events[k]):
            if j < 0:
                missed[i] += share
            else:
                pair[i, j] += share
        for j in range(len(new)):
            if j not in events[k]:
                unpaired[j] += share
    return pair, missed, unpaired


def ranked_marginals(allowed, cost, miss, new, ranked):
    """The same from the cheapest events only; unambiguous only without ties."""
    return marginals(allowed, cost, miss, new, best=ranked)
