"""How many times faster are our CLEAR MOT and identity counters than motmetrics?

Both count the same pairs of the same sequence, in turn, and must agree. Prints the ratio, and the
memory that motmetrics took on top, which limits the size it can be used for. HOTA, which
motmetrics does not have, is timed too.

    python scripts/benchmark_evaluation.py --frames 1000 --objects 100
"""

from __future__ import annotations

import argparse
import platform
import resource
import time
from importlib.metadata import version

import numpy as np

from tracker.evaluation.counts import count
from tracker.evaluation.couples import find_couples
from tracker.evaluation.frames import SideBySide, side_by_side
from tracker.evaluation.hota import count_hota
from tracker.evaluation.referee import referee_counts
from tracker.evaluation.scores import Counts
from tracker.log import Kind, SequenceFacts, Truth
from tracker.results import Tracks, TrackState


def sequence(frames: int, objects: int, seed: int = 1) -> tuple[Tracks, Truth]:
    """Boxes in motion, one in ten undetected, one in twenty false, identities that change."""
    rng = np.random.default_rng(seed)
    side = 40.0 * np.sqrt(objects)
    place, speed = rng.uniform(0, side, (objects, 2)), rng.normal(0, 0.3, (objects, 2))
    frame, thing = np.divmod(np.arange(frames * objects), objects)
    size = np.broadcast_to([20.0, 40.0], (len(frame), 2))
    centre = (place[thing] + speed[thing] * frame[:, None]) % side
    seen = rng.random(len(frame)) < 0.9
    # An identity lasts 200 frames on average.
    change = (rng.random((frames, objects)) < 1 / 200).cumsum(axis=0)
    identity = (change * objects + np.arange(objects)).ravel()[seen]
    found = np.column_stack((centre + rng.normal(0, 1.5, centre.shape), size))[seen]
    stray = rng.random(len(found)) < 0.05
    found[stray, :2] = rng.uniform(0, side, (int(stray.sum()), 2))
    truth = Truth(
        name="benchmark", path=None, digest="", format="csv", kind=Kind.BOX, facts=SequenceFacts(),
        frame=frame, time=None, object=thing, object_names=tuple(map(str, range(objects))),
        z=np.column_stack((centre, size)), label=np.full(len(frame), -1, np.int32),
        line=np.arange(len(frame)), scored=np.ones(len(frame), bool),
        visibility=np.ones(len(frame)),
    )  # fmt: skip
    count_ = len(found)
    tracks = Tracks(
        name="benchmark", kind=Kind.BOX, facts=SequenceFacts(), frame=frame[seen],
        time=frame[seen] / 25.0, track=identity, z=found, score=np.ones(count_),
        label=np.full(count_, -1, np.int32), labels=(),
        state=np.full(count_, TrackState.CONFIRMED, np.int8), reported=np.ones(count_, bool),
        line=np.arange(count_),
    )  # fmt: skip
    return tracks, truth


def pairs(tracks: Tracks, truth: Truth, least_iou: float) -> SideBySide:
    counted = np.ones(len(tracks), bool)
    return side_by_side(tracks, truth, counted, least_iou=least_iou, reach=float("inf"))


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--frames", type=int, default=1000)
    parser.add_argument("--objects", type=int, default=100)
    parser.add_argument("--rounds", type=int, default=3)
    options = parser.parse_args()
    packages = [f"{name} {version(name)}" for name in ("numpy", "numba", "motmetrics", "pandas")]
    print(f"{platform.machine()}, Python {platform.python_version()}, {', '.join(packages)}")
    for frames, objects in ((5, 5), (options.frames, options.objects)):  # the first compiles
        measure(frames, objects, options.rounds)


def measure(frames: int, objects: int, rounds: int) -> None:
    """Count in turn, several times, and print medians."""
    tracks, truth = sequence(frames, objects)
    before = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
    seconds: dict[str, list[float]] = {name: [] for name in ("pair", "count", "referee", "hota")}
    for _ in range(rounds):
        moments = [time.perf_counter()]
        both = pairs(tracks, truth, 0.5)
        moments.append(time.perf_counter())
        mine = count(both, find_couples(both), np.ones(len(both.scene.distance), bool)).counts
        moments.append(time.perf_counter())
        theirs = referee_counts(both.scene)
        moments.append(time.perf_counter())
        looser = pairs(tracks, truth, 0.05)
        count_hota(looser, find_couples(looser))
        moments.append(time.perf_counter())
        for values, step in zip(seconds.values(), np.diff(moments), strict=True):
            values.append(float(step))
        differ = [
            name
            for name in Counts.__dataclass_fields__
            if not np.isclose(getattr(mine, name), getattr(theirs, name), rtol=1e-9, atol=1e-9)
        ]
        if differ:
            raise SystemExit(f"counts differ: {', '.join(differ)}")
    used = (resource.getrusage(resource.RUSAGE_SELF).ru_maxrss - before) / 1024
    pair, ours, referee, hota = (float(np.median(values)) for values in seconds.values())
    print(f"\n{frames} frames x {objects} objects, {both.tracks} tracks: counts equal")
    print(f"  {len(both.scene.pair_row)} pairs that may match, found in {1e3 * pair:.1f} ms")
    print(f"  counting: ours {1e3 * ours:.1f} ms, motmetrics {1e3 * referee:.0f} ms: ", end="")
    print(f"{referee / ours:.0f}x ({referee / (pair + ours):.0f}x with our search for pairs)")
    print(f"  HOTA at 19 thresholds, its pairs included: {1e3 * hota:.0f} ms")
    print(f"  peak memory grew by {used:.0f} MB, nearly all of it motmetrics'")


if __name__ == "__main__":
    main()
