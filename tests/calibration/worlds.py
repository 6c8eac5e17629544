"""Constant-velocity worlds with known parameters, made without the package's simulation."""

from __future__ import annotations

from pathlib import Path

import numpy as np

from tracker.log import DetectionLog, Truth
from tracker.log.model import Kind, SequenceFacts

RATE = 10.0


def world(
    kind=Kind.POINT, *, seed=1, frames=400, objects=12, detected=0.85, clutter=4.0, noise=0.5,
    sigma=0.3, size_noise=0.1, size_sigma=0.05, side=100.0, extent=400.0, speed=3.0,
):  # fmt: skip
    """(log, truth): exact truth; boxes are about `side` wide, and noise is in their scales."""
    rng = np.random.default_rng(seed)
    d = kind.dimension
    unit = side if kind is Kind.BOX else 1.0
    root_q = np.array([noise, noise, size_noise, size_noise][:d]) * unit
    spread = np.array([sigma, sigma, size_sigma, size_sigma][:d]) * unit
    p = np.column_stack(
        [rng.uniform(0, extent, (objects, 2)) * unit, np.full((objects, d - 2), side)]
    )
    v = rng.normal(0, speed * unit, (objects, d))
    v[:, 2:] = 0.0
    t = 1.0 / RATE
    block = np.linalg.cholesky([[t**3 / 3, t**2 / 2], [t**2 / 2, t]])
    truth, z, offsets = [], [], [0]
    for _ in range(frames):
        truth.append(p.copy())
        seen = rng.random(objects) < detected
        real = p[seen] + rng.normal(0, 1, (int(seen.sum()), d)) * spread
        count = rng.poisson(clutter)
        false = np.column_stack(
            [rng.uniform(0, extent, (count, 2)) * unit, np.full((count, d - 2), side)]
        )
        z.append(np.concatenate([real, false]))
        offsets.append(offsets[-1] + len(z[-1]))
        push = np.einsum("ij,jab->iab", block, rng.normal(0, 1, (2, objects, d))) * root_q
        p, v = p + t * v + push[0], v + push[1]
        p[:, 2:] = np.maximum(p[:, 2:], 0.2 * side)
    n, m = frames * objects, offsets[-1]
    numbers = np.arange(1, frames + 1)
    log = DetectionLog(
        name="world", path=Path("world.csv"), digest="", format="csv", kind=kind,
        facts=SequenceFacts(), rate_hz=RATE, rate_source="settings", frame_numbers=numbers,
        frame_times=numbers / RATE, offsets=np.array(offsets), z=np.concatenate(z),
        score=np.full(m, np.nan), label=np.full(m, -1, np.int32), line=np.arange(m),
    )  # fmt: skip
    there = Truth(
        name="world", path=Path("truth.csv"), digest="", format="csv", kind=kind,
        facts=SequenceFacts(), frame=np.repeat(numbers, objects), time=None,
        object=np.tile(np.arange(objects), frames),
        object_names=tuple(str(k) for k in range(objects)), z=np.concatenate(truth),
        label=np.full(n, -1, np.int32), line=np.arange(n), scored=np.ones(n, bool),
        visibility=np.full(n, np.nan),
    )  # fmt: skip
    return log, there
