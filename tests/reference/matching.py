"""Slow twin of tracker/kernels/matching.py: every matching is tried."""

from __future__ import annotations


def cheapest_matching(start, column, cost, columns, reward, tolerance):
    best = []
    for total, chosen in _all_matchings(start, column, cost, reward, 0, frozenset()):
        best.append((total, chosen))
    best.sort(key=lambda item: item[0])
    tied = len(best) > 1 and tolerance >= 0 and best[1][0] - best[0][0] <= tolerance
    return list(best[0][1]), tied


def _all_matchings(start, column, cost, reward, row, used):
    if row == len(start) - 1:
        yield 0.0, ()
        return
    for total, rest in _all_matchings(start, column, cost, reward, row + 1, used):
        yield total, (-1, *rest)
    for e in range(start[row], start[row + 1]):
        if column[e] not in used:
            onward = used | {column[e]}
            for total, rest in _all_matchings(start, column, cost, reward, row + 1, onward):
                yield total + cost[e] - reward, (e, *rest)
