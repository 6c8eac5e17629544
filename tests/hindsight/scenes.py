"""Small scenes with known identities, and runs of them up to what hindsight takes."""

import numpy as np

from tracker.engine import Engine
from tracker.hindsight.pieces import Collector
from tracker.log.model import DetectionLog, Kind, SequenceFacts
from tracker.offline import frames_of
from tracker.settings import load_settings

RATE = 10.0
SIGMA = 0.3  # metres, of each coordinate of a detection


def log_of(frame, z, kind=Kind.POINT, *, frames=None, labels=(), label=None, embedding=None):
    """A detection log of rows in any order."""
    frame, z = np.asarray(frame), np.asarray(z, float)
    order = np.argsort(frame, kind="stable")
    last = int(frame.max()) if frames is None else frames
    numbers = np.arange(1, last + 1)
    count = len(frame)
    return DetectionLog(
        name="made",
        path=None,
        digest="",
        format="made",
        kind=kind,
        facts=SequenceFacts(),
        rate_hz=RATE,
        rate_source="sequence.toml",
        frame_numbers=numbers,
        frame_times=(numbers - 1) / RATE,
        offsets=np.searchsorted(frame[order], np.arange(1, last + 2)),
        z=z[order],
        score=np.full(count, 0.9),
        label=np.full(count, -1, np.int32) if label is None else np.asarray(label, np.int32)[order],
        labels=labels,
        line=order + 1,
        embedding=None if embedding is None else np.asarray(embedding, np.float32)[order],
    )


def walk(rng, steps, start, velocity, noise=0.0):
    """(steps, 4) true states of nearly constant velocity, white-noise acceleration `noise`."""
    t = 1.0 / RATE
    root = np.linalg.cholesky(np.array([[t**3 / 3, t**2 / 2], [t**2 / 2, t]]))
    state = np.array([*start, *velocity], float)
    out = []
    for _ in range(steps):
        out.append(state.copy())
        push = noise * (root @ rng.normal(size=(2, 2)))
        state[:2] += t * state[2:] + push[0]
        state[2:] += push[1]
    return np.array(out)


def settings(*overrides):
    """Settings that fit these scenes."""
    return load_settings(
        None,
        (
            "motion.acceleration_noise=0.5",
            "motion.initial_speed_sigma=3",
            f"measurement.position_sigma={SIGMA}",
            "lifecycle.coast_seconds=1",
            "gate.probability=0.9999999",  # no second track by an outlier of a detection
            "hindsight.common_motion=none",
            "hindsight.noise=settings",
            *overrides,
        ),
    )


def collected(log, chosen):
    """The engine run over a log; returns what it decided and its highest id."""
    engine = Engine(chosen, log.kind)
    collector = Collector()
    for frame in frames_of(log, chosen):
        collector.add(frame, engine.step(frame))
    return collector, engine.table.born


def crossing(seed=3, objects=12, steps=160, hidden=((50, 80),)):
    """Objects that walk in parallel lanes and vanish for some frames behind a wall.

    Returns (frame, z, object): every detection and whose it is. Objects begin and end at
    different times; the wall stands at different times for each.
    """
    rng = np.random.default_rng(seed)
    frame, z, owner = [], [], []
    for k in range(objects):
        begin, end = 3 * k, steps - (5 * k) % 17
        states = walk(rng, end - begin, (0.0, 12.0 * k), (2.0, 0.0), 0.2)
        seen = states[:, :2] + rng.normal(0.0, SIGMA, (len(states), 2))
        for j, place in enumerate(seen):
            if any(low <= j < high for low, high in hidden):
                continue
            frame.append(begin + j + 1)
            z.append(place)
            owner.append(k)
    return np.array(frame), np.array(z), np.array(owner)
