"""Small random scenes for the evaluation kernels."""

from __future__ import annotations

import numpy as np

from tracker.kernels.clearmot import Scene


def random_scene(seed: int, *, frames: int = 6, largest: int = 4, ties: bool = False) -> Scene:
    """Few rows a frame, so that the twins can try every matching; frames may be empty."""
    rng = np.random.default_rng(seed)
    truth, track, start, row = [], [], [[0], [0], [0]], []
    for _ in range(frames):
        objects = np.sort(rng.permutation(largest)[: rng.integers(0, largest + 1)])
        tracks = np.sort(rng.permutation(largest + 2)[: rng.integers(0, largest + 1)])
        for _ in objects:
            near = np.flatnonzero(rng.random(len(tracks)) < 0.6) + len(track)
            row += near.tolist()
            start[2].append(len(row))
        truth += objects.tolist()
        track += tracks.tolist()
        start[0].append(len(truth))
        start[1].append(len(track))
    similarity = rng.uniform(0.0, 1.0, len(row))
    if ties:
        similarity = np.round(similarity * 2) / 2
    whole = [np.array(values, np.int64) for values in (start[0], truth, start[1], track)]
    return Scene(
        *whole,
        np.array(start[2], np.int64),
        np.array(row, np.int64),
        1.0 - similarity,
        similarity,
    )
