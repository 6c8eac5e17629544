"""Slow twins of tracker/kernels/pairing.py."""

from __future__ import annotations

import math


def pair_boxes(truth_start, truth_z, track_start, track_z, least):
    def overlap(a, b):
        width = min(a[0] + a[2] / 2, b[0] + b[2] / 2) - max(a[0] - a[2] / 2, b[0] - b[2] / 2)
        height = min(a[1] + a[3] / 2, b[1] + b[3] / 2) - max(a[1] - a[3] / 2, b[1] - b[3] / 2)
        shared = max(0.0, width) * max(0.0, height)
        return shared / (a[2] * a[3] + b[2] * b[3] - shared)

    return _pairs(truth_start, truth_z, track_start, track_z, overlap, lambda v: v >= least)


def pair_points(truth_start, truth_z, track_start, track_z, most):
    def apart(a, b):
        return math.dist(a[:2], b[:2])

    return _pairs(truth_start, truth_z, track_start, track_z, apart, lambda v: v <= most)


def _pairs(truth_start, truth_z, track_start, track_z, measure, close):
    start, column, value = [0], [], []
    for f in range(len(truth_start) - 1):
        for t in range(truth_start[f], truth_start[f + 1]):
            for j in range(track_start[f], track_start[f + 1]):
                found = measure(truth_z[t], track_z[j])
                if close(found):
                    column.append(j)
                    value.append(found)
            start.append(len(column))
    return start, column, value
