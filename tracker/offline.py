"""Whole logs through the engine: into memory, or into a run folder."""

from __future__ import annotations

import platform
import time
from collections.abc import Callable, Iterable, Iterator
from dataclasses import asdict, dataclass
from importlib.metadata import version
from pathlib import Path
from typing import Any

import numpy as np

from tracker.engine import Engine, FrameResult
from tracker.hindsight import (
    Collector,
    check_hindsight,
    look_back,
    rows_in_hindsight,
    write_hindsight,
)
from tracker.log.model import DetectionLog, Frame
from tracker.results.folder import atomic_folder
from tracker.results.recorder import Recorder, TrackRows, no_rows
from tracker.results.tracks import TRACKS, TRACKS_ONLINE, Tracks
from tracker.results.write import RunWriter, write_json
from tracker.settings import Settings

Watch = Callable[[Iterable[Frame], int], Iterator[Frame]]


@dataclass(slots=True)
class ProofSummary:
    """How the certificates of a run came out; gaps are relative to the component's costs."""

    frames: int = 0
    components: int = 0
    candidates: int = 0
    largest_gap: float = 0.0
    largest_violation: float = 0.0

    def add(self, result: FrameResult) -> None:
        self.frames += 1
        for tier in result.tiers:
            self.components += tier.solution.components
            self.candidates += len(tier.problem.column)
            self.largest_gap = max(self.largest_gap, abs(tier.solution.gap))
            self.largest_violation = max(self.largest_violation, tier.solution.violation)


def frames_of(log: DetectionLog, settings: Settings) -> Iterator[Frame]:
    """The frames that the engine sees: absent frame numbers are empty scans if so set."""
    if settings.time.absent_frames == "not-scanned":
        yield from log.frames()
        return
    previous: Frame | None = None
    for frame in log.frames():
        if previous is not None:
            yield from _empty_between(previous, frame)
        yield frame
        previous = frame
    last = log.facts.frames
    if previous is not None and last is not None:
        for number in range(previous.number + 1, last + 1):
            moment = previous.time + (number - previous.number) / log.rate_hz
            yield _empty(previous, number, moment)


def frame_total(log: DetectionLog, settings: Settings) -> int:
    """How many frames `frames_of` yields."""
    if settings.time.absent_frames == "not-scanned" or not log.frame_count:
        return log.frame_count
    last = max(int(log.frame_numbers[-1]), log.facts.frames or 0)
    return last - int(log.frame_numbers[0]) + 1


def _empty_between(previous: Frame, following: Frame) -> Iterator[Frame]:
    missing = following.number - previous.number
    for k in range(1, missing):
        moment = previous.time + (following.time - previous.time) * k / missing
        yield _empty(previous, previous.number + k, moment)


def _empty(like: Frame, number: int, moment: float) -> Frame:
    return Frame(
        number=number,
        time=moment,
        z=like.z[:0],
        score=like.score[:0],
        label=like.label[:0],
        line=like.line[:0],
        sigma=None if like.sigma is None else like.sigma[:0],
        embedding=None if like.embedding is None else like.embedding[:0],
    )


def used_detections(log: DetectionLog, settings: Settings) -> DetectionLog:
    """The log without detections below ``sensor.score_floor``; frames stay, empty if need be."""
    floor = settings.sensor.score_floor
    if floor is None or not np.any(log.score < floor):
        return log
    return log.select(~(log.score < floor))


def track_log(
    log: DetectionLog, settings: Settings | None = None, *, offline: bool = False
) -> Tracks:
    """Run a log through the engine and return its tracks, as the run folder would hold them.

    offline : decide identities anew once the log is over (`tracker.hindsight`).

    Raises what `Engine.step` raises, and SettingsError for a motion model that cannot look back.
    """
    settings = settings or Settings()
    used = used_detections(log, settings)
    engine = Engine(settings, log.kind, facts=log.facts, explain=offline)
    if offline:
        check_hindsight(settings, log)
        collector = Collector()
        for frame in frames_of(used, settings):
            collector.add(frame, engine.step(frame))
        found = look_back(used, collector, settings, engine.table.born)
        return as_tracks(log, rows_in_hindsight(used, found, settings)[0])
    recorder = Recorder(settings, log.kind)
    parts: list[TrackRows] = []
    for frame in frames_of(used, settings):
        parts += recorder.add(frame, engine.step(frame))
    parts += recorder.finish()
    return as_tracks(log, TrackRows.join(parts) if parts else no_rows(log.kind))


def as_tracks(log: DetectionLog, rows: TrackRows) -> Tracks:
    """Rows of a log's tracks as `Tracks`."""
    return Tracks(
        name=log.name,
        kind=log.kind,
        facts=log.facts,
        frame=rows.frame,
        time=rows.time,
        track=rows.track,
        z=rows.z,
        score=rows.score,
        label=rows.label,
        labels=log.labels,
        state=rows.state,
        reported=rows.reported,
        line=rows.line,
    )


def associate_log(
    log: DetectionLog,
    settings: Settings,
    out: Path,
    *,
    offline: bool = False,
    watch: Watch | None = None,
) -> dict[str, Any]:
    """Run a log through the engine into the run folder `out`; returns the facts of run.json.

    offline : decide identities anew once the log is over; the engine's own tracks, which the
    ledger speaks of, are then in tracks_online.   watch : wraps the frames, to show progress.

    Raises OutputError where the folder cannot be written, what `Engine.step` raises, and
    SettingsError for a motion model that cannot look back. Nothing is left behind in any case.
    """
    began = time.perf_counter()
    if offline:
        check_hindsight(settings, log)
    collector = Collector() if offline else None
    name = TRACKS_ONLINE if offline else TRACKS
    used = used_detections(log, settings)
    engine = Engine(settings, log.kind, facts=log.facts)
    proofs = ProofSummary()
    total = frame_total(used, settings)
    seconds = np.zeros(total)
    with atomic_folder(out, marker="run.json") as folder:
        with RunWriter(folder, log, settings, tracks=name) as writer:
            frames: Iterable[Frame] = frames_of(used, settings)
            for k, frame in enumerate(watch(frames, total) if watch else frames):
                start = time.perf_counter()
                result = engine.step(frame)
                seconds[k] = time.perf_counter() - start
                proofs.add(result)
                writer.add(frame, result)
                if collector is not None:
                    collector.add(frame, result)
            facts = _facts(log, used, proofs, engine.table.born)
            if collector is not None:
                found = look_back(used, collector, settings, engine.table.born)
                facts["hindsight"] = write_hindsight(folder, used, found, settings)
            writer.finish(facts)
        facts["counts"] |= writer.counts
        write_json(folder / "timings.json", _timings(seconds, time.perf_counter() - began))
    return facts


def _facts(
    log: DetectionLog, used: DetectionLog, proofs: ProofSummary, born: int
) -> dict[str, Any]:
    """What run.json says: nothing in it depends on the machine's speed or the clock."""
    return {
        "name": log.name,
        "kind": str(log.kind),
        "input": {"file": log.path.name, "sha256": log.digest, "format": log.format},
        "sequence": asdict(log.facts),
        "rate_hz": log.rate_hz,
        "rate_source": log.rate_source,
        "counts": {
            "frames": proofs.frames,
            "detections": len(log),
            "detections_below_score_floor": len(log) - len(used),
            "rejected_rows": len(log.rejections),
            "tracks_born": born,
        },
        "certificate": asdict(proofs),
        "notes": list(log.notes),
        "versions": {
            "margent": version("margent"),
            "python": platform.python_version(),
            **{name: version(name) for name in ("numpy", "numba", "scipy", "pyarrow")},
        },
        "caution": (
            "Tracks can be wrong, and tracks of people are personal data: follow the law and "
            "the safety practice that apply where you are."
        ),
    }


def _timings(seconds: np.ndarray, total: float) -> dict[str, Any]:
    """timings.json: apart from run.json, so that equal runs have equal bytes there."""
    quantiles = np.quantile(seconds, (0.5, 0.9, 0.99, 1.0)) if len(seconds) else np.zeros(4)
    return {
        "total_seconds": total,
        "engine_seconds": float(seconds.sum()),
        "frame_milliseconds": {
            name: 1e3 * float(value)
            for name, value in zip(("median", "p90", "p99", "largest"), quantiles, strict=True)
        },
    }
