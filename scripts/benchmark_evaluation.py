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
from tracker.log import Kind, SequenceFacts, Truth
from tracker.results import Tracks, TrackState


def sequence(frames: int, objects: int, seed: int = 1) -> tuple[Tracks, Truth]:
    """Boxes in motion, one in ten undetected, one in twenty tracks false, identities that change."""
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


def pairs(tracks: Tracks, truth: Truth) -> SideBySide:
    return side_by_side(
        tracks, truth, np.ones(len(tracks), bool), least_iou=0.05, reach=float("inf")
    )


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--frames", type=int, default=1000)
    parser.add_argument("--objects", type=int, default=100)
    parser.add_argument("--rounds", type=int, default=3)
    options = parser.parse_args()
    packages = [f"{name} {version(name)}" for name in ("numpy", "numba", "motmetrics", "pandas")]
    print(f"{platform.machine()}, Python {platform.python_version()}, {', '.join(packages)}")
    seconds: dict[str, list[float]] = {"ours": [], "motmetrics": [], "HOTA": []}
    for size in ((5, 5), (options.frames, options.objects)):  # the first compiles
        tracks, truth = sequence(*size)
        before = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
        for values in seconds.values():
            values.clear()
        for _ in range(options.rounds):
            start = time.perf_counter()
            both = pairs(tracks, truth)
            close = both.scene.similarity >= 0.5
            couples = find_couples(both)
            mine = count(both, couples, close)
            seconds["ours"].append(time.perf_counter() - start)
            scene = both.only_pairs(close)
            start = time.perf_counter()
            theirs = referee_counts(scene)
            seconds["motmetrics"].append(time.perf_counter() - start)
            start = time.perf_counter()
            count_hota(both, couples)
            seconds["HOTA"].append(time.perf_counter() - start)
            differ = {
                name
                for name in ("switches", "matches", "fragmentations", "identity_matches")
                if getattr(mine, name) != getattr(theirs, name)
            }
            print(f"{size[0]} frames x {size[1]}: counts {differ or 'equal'}")
    used = (resource.getrusage(resource.RUSAGE_SELF).ru_maxrss - before) / 1024
    ours, referee, hota = (float(np.median(values)) for values in seconds.values())
    print(f"{len(scene.pair_row)} possible pairs, {both.objects} objects, {both.tracks} tracks")
    print(
        f"ours {ours:.3f} s (pairing included), motmetrics {referee:.3f} s: {referee / ours:.0f}x"
    )
    print(f"HOTA at 19 thresholds {hota:.3f} s; peak memory grew by {used:.0f} MB")


if __name__ == "__main__":
    main()
