"""How many times faster is an engine step than a plain pipeline on the same frames?

Baseline: one filterpy object a track, numpy IoU, scipy's dense assignment. Both see the same
frames in turn, so a noisy machine slows both. Prints ratios; what is not faster is printed too.

Then the engine alone as scenes grow at constant density.

    python scripts/benchmark_engine.py --objects 1 10 100 1000 --growth 100 10000
"""

from __future__ import annotations

import argparse
import platform
import time
from importlib.metadata import version

import numpy as np
from filterpy.kalman import KalmanFilter
from scipy.optimize import linear_sum_assignment

from tracker import Engine, Frame, Settings


def scene(objects: int, frames: int, seed: int = 1) -> list[Frame]:
    """Boxes moving at constant velocity at constant density, a tenth of them undetected."""
    rng = np.random.default_rng(seed)
    side = 60.0 * np.sqrt(objects)
    place = rng.uniform(0, side, (objects, 2))
    speed = rng.normal(0, 20.0, (objects, 2))
    size = rng.uniform(18, 30, (objects, 2))
    out = []
    for k in range(frames):
        seen = rng.random(objects) < 0.9
        centre = place + speed * k / 25 + rng.normal(0, 0.8, (objects, 2))
        corner = np.column_stack((centre - size / 2, size))[seen]
        out.append(Frame.of_boxes(k + 1, k / 25, corner, rng.uniform(0.5, 1, seen.sum())))
    return out


class Baseline:
    """What one writes in an afternoon: an object a track, dense matrices."""

    def __init__(self) -> None:
        self.tracks: list[KalmanFilter] = []
        self.missed: list[int] = []

    def step(self, frame: Frame) -> None:
        z = frame.z
        for track in self.tracks:
            track.predict()
        boxes = np.array([track.x[:4, 0] for track in self.tracks]).reshape(-1, 4)
        overlap = _overlap(boxes, z)
        rows, columns = linear_sum_assignment(1.0 - overlap)
        good = overlap[rows, columns] > 0.25
        rows, columns = rows[good], columns[good]
        for i, j in zip(rows, columns, strict=True):
            self.tracks[i].update(z[j])
        self.missed = [
            0 if hit else count + 1
            for count, hit in zip(self.missed, np.isin(np.arange(len(boxes)), rows), strict=True)
        ]
        alive = [k for k, count in enumerate(self.missed) if count <= 30]
        self.tracks = [self.tracks[k] for k in alive]
        self.missed = [self.missed[k] for k in alive]
        for j in np.setdiff1d(np.arange(len(z)), columns):
            self.tracks.append(_new_filter(z[j]))
            self.missed.append(0)


def _new_filter(z: np.ndarray) -> KalmanFilter:
    track = KalmanFilter(dim_x=8, dim_z=4)
    track.F[:4, 4:] = np.eye(4) / 25
    track.H[:, :4] = np.eye(4)
    track.P *= 100.0
    track.R *= 2.0
    track.Q *= 0.5
    track.x[:4, 0] = z
    return track


def _overlap(a: np.ndarray, b: np.ndarray) -> np.ndarray:
    low = np.maximum((a[:, :2] - a[:, 2:] / 2)[:, None], (b[:, :2] - b[:, 2:] / 2)[None])
    high = np.minimum((a[:, :2] + a[:, 2:] / 2)[:, None], (b[:, :2] + b[:, 2:] / 2)[None])
    shared = np.clip(high - low, 0, None).prod(axis=2)
    return shared / (a[:, 2:].prod(axis=1)[:, None] + b[:, 2:].prod(axis=1)[None] - shared)


def measure(objects: int, frames: int, rounds: int = 3) -> tuple[float, float]:
    """Median seconds a frame of (baseline, engine): in turn, several rounds over the frames.

    The first third of each round is left out: tracks are still being born there.
    """
    log = scene(objects, frames)
    seconds: tuple[list[float], list[float]] = ([], [])
    for _ in range(rounds):
        baseline, engine = Baseline(), Engine(Settings())
        for kept, step in zip(seconds, (baseline.step, engine.step), strict=True):
            for k, frame in enumerate(log):
                start = time.perf_counter()
                step(frame)
                if k >= frames // 3:
                    kept.append(time.perf_counter() - start)
    return float(np.median(seconds[0])), float(np.median(seconds[1]))


def growth(objects: int, frames: int = 12) -> float:
    """Median seconds an object and frame of the engine alone."""
    engine = Engine(Settings())
    seconds = []
    for frame in scene(objects, frames):
        start = time.perf_counter()
        engine.step(frame)
        seconds.append(time.perf_counter() - start)
    return float(np.median(seconds[frames // 3 :])) / objects


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--objects", type=int, nargs="+", default=[1, 10, 100, 1000])
    parser.add_argument("--frames", type=int, default=90)
    parser.add_argument("--growth", type=int, nargs="+", default=[100, 1000, 10_000, 100_000])
    options = parser.parse_args()
    packages = [f"{name} {version(name)}" for name in ("numpy", "numba", "scipy", "filterpy")]
    print(f"{platform.machine()}, Python {platform.python_version()}, {', '.join(packages)}")
    print(f"{'objects':>8} {'baseline ms':>12} {'engine ms':>10} {'ratio':>7}")
    measure(3, 9)  # compile
    for objects in options.objects:
        baseline, engine = measure(objects, options.frames)
        print(f"{objects:8d} {1e3 * baseline:12.3f} {1e3 * engine:10.3f} {baseline / engine:7.1f}")
    print("engine alone at constant density")
    for objects in options.growth:
        print(f"{objects:8d} {1e6 * growth(objects):12.3f} us an object")


if __name__ == "__main__":
    main()
