"""Small runs to be explained, and a brute-force solver that shares nothing with the package."""

from __future__ import annotations

import math
from pathlib import Path

import numpy as np
import pyarrow.parquet as pq

from tests.log.files import SHIPPED
from tracker.log import read_log
from tracker.log.model import DetectionLog, Kind, SequenceFacts, box_centre
from tracker.offline import associate_log
from tracker.settings import load_settings

RATE_HZ = 10.0


def made_log(frames, kind=Kind.POINT, **columns):
    """A log from {frame number: [(x, y[, width, height])]}, boxes by left and top, lines from 2.

    columns : score (one a detection, in order) and the like, put in place of the defaults.
    """
    numbers = np.array(sorted(frames), np.int64)
    rows = [np.array(frames[n], float).reshape(-1, kind.dimension) for n in numbers]
    z = np.concatenate(rows) if rows else np.empty((0, kind.dimension))
    count = len(z)
    values = {
        "name": "made",
        "path": Path("made.csv"),
        "digest": "0" * 64,
        "format": "csv",
        "kind": kind,
        "facts": SequenceFacts(),
        "rate_hz": RATE_HZ,
        "rate_source": "settings",
        "frame_numbers": numbers,
        "frame_times": numbers / RATE_HZ,
        "offsets": np.concatenate(([0], np.cumsum([len(row) for row in rows]))).astype(np.int64),
        "z": box_centre(z) if kind is Kind.BOX else z,
        "score": np.full(count, np.nan),
        "label": np.full(count, -1, np.int32),
        "line": np.arange(2, count + 2),
    }
    return DetectionLog(**(values | columns))


def made_run(folder, log, *settings, level="full"):
    """Associate a log into a folder."""
    associate_log(log, load_settings(None, (f"ledger.level={level}", *settings)), folder)
    return folder


def crossing(seed=3):
    """Two points that pass close to each other in frame 10; one is not seen in frame 14, and a
    third turns up in frame 16."""
    rng = np.random.default_rng(seed)
    frames = {}
    for n in range(1, 21):
        t = (n - 10) / RATE_HZ
        points = [(2.0 * t, 0.03 + 0.4 * t), (-2.0 * t, -0.03 - 0.4 * t)]
        if n == 14:
            points.pop()
        if n >= 16:
            points.append((3.0, 3.0 + t))
        frames[n] = np.array(points) + rng.normal(0.0, 0.03, (len(points), 2))
    return made_log(frames)


# Noise as it was drawn, so that the gates around the crossing are a few standard deviations.
CROSSING = (
    "measurement.position_sigma=0.05",
    "motion.acceleration_noise=1.0",
    "motion.initial_speed_sigma=3.0",
)


# Settings under which the shipped sequences have the switches that are asked about, whatever the
# defaults become.
PINNED = (
    "sensor.detection_probability=0.9",
    "motion.acceleration_noise=5.0",
    "motion.size_noise=0.5",
    "motion.initial_speed_sigma=2.0",
    "motion.initial_size_rate_sigma=0.2",
    "measurement.position_sigma=0.05",
    "measurement.size_sigma=0.1",
    "gate.probability=0.999",
    "gate.overlap_floor=0.0",
    'cost.terms=["overlap"]',
    "cost.overlap.nats=8.0",
    "cost.overlap.neutral=0.5",
    "lifecycle.confirm_hits=2",
    "lifecycle.confirm_window=3",
    "lifecycle.coast_seconds=1.5",
)


def shipped_log(name):
    """A sequence of the registry package motmetrics, identities dropped, at its 25 frames a s."""
    return read_log(SHIPPED / name / "test.txt", drop_identities=True, frame_rate_hz=25.0)


def ledger_component(folder, frame, track):
    """(costs {(track, detection): nats}, tracks, detections) of the component of a track, from
    decisions.parquet of a run with one tier and everything recorded."""
    rows = pq.read_table(folder / "decisions.parquet").to_pylist()
    rows = [row for row in rows if row["frame"] == frame]
    component = next(row["component"] for row in rows if row["track"] == track)
    rows = [row for row in rows if row["component"] == component]
    costs = {
        (row["track"], row["detection"]): row["cost"] for row in rows if row["decision"] == "pair"
    }
    tracks = sorted({row["track"] for row in rows} - {None})
    return costs, tracks, sorted({row["detection"] for row in rows} - {None})


def all_answers(costs, tracks, detections, miss):
    """Yield (cost, {track: detection or None}) of every optional assignment; new costs are 0."""
    if not tracks:
        yield 0.0, {}
        return
    first, *rest = tracks
    for j in [None, *detections]:
        if j is not None and (first, j) not in costs:
            continue
        left = [other for other in detections if other != j]
        for cost, answer in all_answers(costs, rest, left, miss):
            yield cost + (miss if j is None else costs[first, j]), {first: j, **answer}


def miss_nats(detection_probability=0.9, gate_probability=0.999):
    """−ln(1 − P_D P_G)."""
    return -math.log(1.0 - detection_probability * gate_probability)
