"""Slow twin of tracker/kernels/gospa.py: the definitions, with every pairing tried."""

from __future__ import annotations

import itertools
from math import sqrt


def set_pairs(scene, cut_off):
    pairs, square = [], []
    for f in range(len(scene.truth_start) - 1):
        rows = range(scene.truth_start[f], scene.truth_start[f + 1])
        apart = {
            (t, scene.pair_row[e]): scene.distance[e]
            for t in rows
            for e in range(scene.pair_start[t], scene.pair_start[t + 1])
        }
        best = (0.0, 0, 0.0)
        for size in range(1, len(apart) + 1):
            for chosen in itertools.combinations(apart, size):
                if len({t for t, _ in chosen}) == len({j for _, j in chosen}) == size:
                    total = sum(apart[pair] ** 2 for pair in chosen)
                    best = min(best, (total - size * cut_off**2, size, total))
        pairs.append(best[1])
        square.append(best[2])
    return pairs, square


def gospa(truth, tracks, distance, cut_off):
    """GOSPA of two lists (p = 2, α = 2) from its definition over assignments."""
    best = float("inf")
    for assigned in _partial(range(len(truth)), range(len(tracks))):
        total = sum(min(distance(truth[i], tracks[j]), cut_off) ** 2 for i, j in assigned)
        rest = len(truth) + len(tracks) - 2 * len(assigned)
        best = min(best, total + cut_off**2 / 2 * rest)
    return sqrt(best)


def ospa(truth, tracks, distance, cut_off):
    """OSPA of two lists (p = 2) from its definition over permutations."""
    few, many = sorted((truth, tracks), key=len)
    if not many:
        return 0.0
    best = min(
        sum(min(distance(a, b), cut_off) ** 2 for a, b in zip(few, order, strict=True))
        for order in itertools.permutations(many, len(few))
    )
    return sqrt((best + cut_off**2 * (len(many) - len(few))) / len(many))


def _partial(rows, columns):
    for size in range(min(len(rows), len(columns)) + 1):
        for some in itertools.combinations(rows, size):
            for others in itertools.permutations(columns, size):
                yield list(zip(some, others, strict=True))
