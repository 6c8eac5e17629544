"""What each part of --offline gives: scores of logs with parts of it, alone and together.

    python scripts/study_hindsight.py LOG=TRUTH [LOG=TRUTH ...] [--set SECTION.NAME=VALUE ...]

All rows share the engine's decisions; overall scores come from summed counts. Without arguments:
the sample sequences of boxes.
"""

from __future__ import annotations

import argparse
from pathlib import Path

from tracker import Settings, Tracks, evaluate, load_settings, read_log, read_truth
from tracker.engine import Engine
from tracker.evaluation.scores import Scores
from tracker.hindsight import Collector, look_back, rows_in_hindsight
from tracker.offline import as_tracks, frames_of, used_detections

SAMPLES = Path(__file__).resolve().parent.parent / "sample_sequences"
BOXES = ("forecourt", "fog", "rush", "sway")

NO_FILLING = "hindsight.fill_seconds=0"
NO_LINKS = "hindsight.link_seconds=0"
NO_CUTS = ("hindsight.cut_seconds=1e9", "hindsight.cut_margin=0")
STILL = "hindsight.common_motion=none"
ROWS = {
    "online": (NO_LINKS, NO_FILLING),
    "smoothing alone": (NO_LINKS, NO_FILLING, "output.position=estimated"),
    "filling alone": (NO_LINKS,),
    "linking alone": (NO_FILLING, *NO_CUTS),
    "cutting and linking": (NO_FILLING,),
    "linking and filling": NO_CUTS,
    "all": (),
    "all, without common motion": (STILL,),
    "all, noise of the settings": ("hindsight.noise=settings",),
    "all, boxes smoothed": ("output.position=estimated",),
}


def main() -> None:
    """Print one line a variant."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("pairs", nargs="*", metavar="LOG=TRUTH")
    parser.add_argument("--set", action="append", default=[], metavar="SECTION.NAME=VALUE")
    options = parser.parse_args()
    pairs = [text.partition("=")[::2] for text in options.pairs]
    pairs = pairs or [(str(SAMPLES / name), str(SAMPLES / name)) for name in BOXES]
    base = load_settings(None, tuple(options.set))
    runs = [_decided(log, truth, base) for log, truth in pairs]
    print(f"{'':28}  IDF1    MOTA    switches  false rows")
    for name, changes in ROWS.items():
        settings = load_settings(None, (*options.set, *changes))
        found = [evaluate(_seen(run, settings), run[1], with_referee=False) for run in runs]
        total = Scores.total(found)
        counts = total.counts
        print(
            f"{name:28}  {total.idf1:.4f}  {total.mota:.4f}  {counts.switches:8d}  "
            f"{counts.false_positives:10d}",
            flush=True,
        )


def _decided(log_path: str, truth_path: str, settings: Settings) -> tuple:
    log = used_detections(read_log(log_path), settings)
    engine = Engine(settings, log.kind)
    collector = Collector()
    for frame in frames_of(log, settings):
        collector.add(frame, engine.step(frame))
    return log, read_truth(truth_path), collector, engine.table.born


def _seen(run: tuple, settings: Settings) -> Tracks:
    log, _, collector, born = run
    found = look_back(log, collector, settings, born)
    return as_tracks(log, rows_in_hindsight(log, found, settings)[0])


if __name__ == "__main__":
    main()
