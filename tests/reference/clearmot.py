"""Slow twins of tracker/kernels/clearmot.py, with dictionaries and every matching tried."""

from __future__ import annotations

import itertools

from tests.reference.matching import cheapest_matching


def pair_over_time(scene, keep, partner, match, first):
    frames = len(scene.truth_start) - 1
    for f in range(first, frames):
        if settle_frame(scene, keep, partner, match, f, False):
            return f
    return frames


def settle_frame(scene, keep, partner, match, f, any_answer):
    rows = range(scene.truth_start[f], scene.truth_start[f + 1])
    tracks = range(scene.track_start[f], scene.track_start[f + 1])
    for t in rows:
        match[t] = -1
    taken = [False] * len(tracks)
    if keep:
        keep_pairs(scene, partner, match, f, taken)
    start, column, cost, origin = [0], [], [], []
    for t in rows:
        if match[t] < 0:
            for e in range(scene.pair_start[t], scene.pair_start[t + 1]):
                if not taken[scene.pair_row[e] - tracks.start]:
                    column.append(scene.pair_row[e])
                    cost.append(scene.distance[e])
                    origin.append(e)
        start.append(len(column))
    if not column:
        return False
    reward = 2 * min(len(rows), len(tracks)) * (max(cost) + 1) + 1
    chosen, tied = cheapest_matching(start, column, cost, len(tracks), reward, 1e-12 * reward)
    if tied and not any_answer:
        return True
    for t, e in zip(rows, chosen, strict=True):
        if e >= 0:
            match[t] = origin[e]
            partner[scene.truth[t]] = scene.track[scene.pair_row[origin[e]]]
    return tied


def keep_pairs(scene, partner, match, f, taken):
    for t in range(scene.truth_start[f], scene.truth_start[f + 1]):
        for e in range(scene.pair_start[t], scene.pair_start[t + 1]):
            j = scene.pair_row[e]
            place = j - scene.track_start[f]
            if scene.track[j] == partner[scene.truth[t]] and not taken[place]:
                match[t] = e
                taken[place] = True


def count_lifetimes(scene, match, objects):
    rows, paired, switches, gaps = [], [], [], []
    for k in range(objects):
        mine = [match[t] for t in range(len(scene.truth)) if scene.truth[t] == k]
        tracks = [None if e < 0 else scene.track[scene.pair_row[e]] for e in mine]
        seen = [track for track in tracks if track is not None]
        rows.append(len(mine))
        paired.append(len(seen))
        switches.append(sum(a != b for a, b in itertools.pairwise(seen)))
        word = "".join("." if track is None else "x" for track in tracks).strip(".")
        gaps.append(sum(part != "" for part in word.split("x")))
    return rows, paired, switches, gaps
