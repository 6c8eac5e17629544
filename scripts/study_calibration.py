"""IDF1 of default and calibrated settings on held-out seeds and, if given, on real logs.

    python scripts/study_calibration.py [--real FOLDER]

FOLDER holds one folder a sequence with truth.txt and detections_*.txt; each sequence is tracked
with settings calibrated on the others.
"""

from __future__ import annotations

import argparse
import tempfile
from pathlib import Path

from tracker import Settings, calibrate, evaluate, read_log, read_truth, track_log
from tracker.evaluation.scores import Scores
from tracker.simulation import simulate
from tracker.simulation.writing import write_sequence

SCENES = {"fog": None, "harbour": 50.0, "rush": None}
LEARN, TEST = (1, 2, 3), (11, 12, 13)


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--real", type=Path)
    parser.add_argument("--scene", action="append", choices=list(SCENES))
    parser.add_argument("--pattern", default="detections_*.txt")
    asked = parser.parse_args()
    print(f"{'data':12} {'default':>8} {'calibrated':>10}")
    for scene in asked.scene or ([] if asked.real else SCENES):
        reach = SCENES[scene]
        learn, test = [made(scene, s) for s in LEARN], [made(scene, s) for s in TEST]
        tuned = fitted(learn, reach)
        report(scene, idf1(test, Settings(), reach), idf1(test, tuned, reach))
    if asked.real:
        real(asked.real, asked.pattern)


def made(scene, seed):
    with tempfile.TemporaryDirectory() as folder:
        place = Path(folder) / scene
        write_sequence(simulate(scene, seed=seed), place)
        return read_log(place), read_truth(place)


def fitted(pairs, reach):
    found = calibrate([a for a, _ in pairs], [b for _, b in pairs], distance_threshold=reach)
    for item in found.evidence:
        print(f"    {item.setting}: {item.sentence}")
    print(f"    held out: {found.consistency}")
    return found.settings


def scores(pairs, settings, reach):
    from tracker.evaluation import Scope

    scope = Scope(distance_threshold=reach) if reach else Scope()
    return [
        evaluate(track_log(log, settings), truth, scope, with_referee=False) for log, truth in pairs
    ]


def idf1(pairs, settings, reach):
    return Scores.total(scores(pairs, settings, reach)).as_dict()["idf1"]


def report(name, before, after):
    print(f"{name:12} {before:8.4f} {after:10.4f}", flush=True)


def real(folder, pattern):
    sequences = {
        place.name: [(read_log(p), read_truth(place / "truth.txt"))
                     for p in sorted(place.glob(pattern))]
        for place in sorted(folder.iterdir()) if place.is_dir()
    }  # fmt: skip
    before, after = [], []
    for name, pairs in sequences.items():
        others = [pair for other, items in sequences.items() if other != name for pair in items]
        tuned = fitted(others, None)
        mine = scores(pairs, Settings(), None), scores(pairs, tuned, None)
        report(name, *(Scores.total(m).as_dict()["idf1"] for m in mine))
        before += mine[0]
        after += mine[1]
    report("all", *(Scores.total(m).as_dict()["idf1"] for m in (before, after)))


if __name__ == "__main__":
    main()
