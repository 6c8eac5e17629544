"""Slow twin of tracker/kernels/hota.py, from the formulas of Luiten et al. 2021 (from memory)."""

from __future__ import annotations

import itertools
from math import sqrt

EPSILON = 1e-5


def hota_counts(scene, couple, couples, object_rows, track_rows, thresholds):
    del couple, couples, object_rows, track_rows  # found here from the scene itself
    hits, association, similarity = [], [], []
    for alpha in thresholds:
        positives = true_positives(scene, alpha)
        hits.append(len(positives))
        association.append(sum(accuracy(scene, positives, c) for c in positives))
        similarity.append(sum(scene.similarity[e] for _, _, e in positives))
    return hits, association, similarity


def hota_by_frame(scene, couple, couples, object_rows, track_rows, thresholds):
    del couple, couples, object_rows, track_rows
    out = []
    for f in range(len(scene.truth_start) - 1):
        first = scene.pair_start[scene.truth_start[f]]
        last = scene.pair_start[scene.truth_start[f + 1]]
        rows = []
        for alpha in thresholds:
            positives = true_positives(scene, alpha)
            here = [c for c in positives if first <= c[2] < last]
            rows.append(
                (
                    len(here),
                    sum(accuracy(scene, positives, c) for c in here),
                    sum(scene.similarity[c[2]] for c in here),
                )
            )
        out.append(rows)
    return tuple([[row[part] for row in rows] for rows in out] for part in range(3))


def true_positives(scene, alpha):
    """List of (object, track, pair) over all frames."""
    possible = [
        (scene.truth[t], scene.track[scene.pair_row[e]], e)
        for t in range(len(scene.truth))
        for e in range(scene.pair_start[t], scene.pair_start[t + 1])
        if scene.similarity[e] >= alpha
    ]
    out = []
    for f in range(len(scene.truth_start) - 1):
        first = scene.pair_start[scene.truth_start[f]]
        last = scene.pair_start[scene.truth_start[f + 1]]
        here = [pair for pair in possible if first <= pair[2] < last]
        weight = {
            pair: 1 / EPSILON
            + accuracy(scene, possible, pair)
            + EPSILON * scene.similarity[pair[2]]
            for pair in here
        }
        best, score = (), 0.0
        for size in range(len(here) + 1):
            for chosen in itertools.combinations(here, size):
                objects, tracks = {c[0] for c in chosen}, {c[1] for c in chosen}
                total = sum(weight[c] for c in chosen)
                if len(objects) == len(tracks) == size and total > score:
                    best, score = chosen, total
        out += best
    return out


def accuracy(scene, positives, c):
    """A(c) = TPA / (TPA + FNA + FPA)."""
    shared = sum(p[:2] == c[:2] for p in positives)
    missed = sum(k == c[0] for k in scene.truth) - shared
    wrong = sum(k == c[1] for k in scene.track) - shared
    return shared / (shared + missed + wrong)


def hota(hits, association, truth_rows, track_rows):
    """HOTA at one threshold: sqrt(sum of A(c) / (TP + FN + FP))."""
    return sqrt(association / (truth_rows + track_rows - hits))
