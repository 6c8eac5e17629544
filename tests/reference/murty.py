"""Slow twins of kernels/murty.py: all events, one after the other."""

import numpy as np


def all_events(allowed):
    """Every joint event as a tuple of columns, -1 for a missed row."""
    rows, columns = allowed.shape

    def extend(event):
        i = len(event)
        if i == rows:
            yield event
            return
        yield from extend((*event, -1))
        for j in range(columns):
            if allowed[i, j] and j not in event:
                yield from extend((*event, j))

    return list(extend(()))


def event_cost(cost, miss, new, event):
    """Cost of one event: pairs, missed rows and new columns."""
    total = sum(new[j] for j in range(len(new)) if j not in event)
    for i, j in enumerate(event):
        total += miss[i] if j < 0 else cost[i, j]
    return total


def event_bound(allowed):
    """The number of events, counted."""
    return len(all_events(allowed))


def rank_component(allowed, cost, miss, new, k):
    """(costs of the k cheapest events, {event: cost} of all, Σ exp(best − cost) of all)."""
    costs = {event: event_cost(cost, miss, new, event) for event in all_events(allowed)}
    ordered = np.sort(np.array(list(costs.values()), float))
    return ordered[:k], costs, np.exp(ordered[0] - ordered).sum()
