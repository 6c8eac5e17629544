"""Several logs in one process or many; a worker takes whole logs, so results are the same."""

from __future__ import annotations

import runpy
from collections import Counter
from collections.abc import Iterator
from concurrent.futures import ProcessPoolExecutor
from concurrent.futures.process import BrokenProcessPool
from dataclasses import dataclass, field, replace
from multiprocessing import get_context
from pathlib import Path
from typing import Any

from tracker.errors import InputError, InternalError, MargentError, UsageError
from tracker.log import read_log
from tracker.log.facts import name_of, read_facts
from tracker.log.source import locate
from tracker.offline import Watch, associate_log
from tracker.settings import Settings

DEFAULT_OUT = Path("runs")


@dataclass(slots=True)
class Outcome:
    """What became of one log: its run folder and facts, or the error."""

    log: Path
    folder: Path
    name: str | None = None  # of the run, where the log's own name would not tell it apart
    facts: dict[str, Any] = field(default_factory=dict)
    error: MargentError | None = None


def associate_logs(
    logs: list[Path],
    out: Path | None,
    settings: Settings,
    reading: dict[str, Any],
    workers: int = 1,
    extensions: tuple[Path, ...] = (),
    watch: Watch | None = None,
    offline: bool = False,
) -> Iterator[Outcome]:
    """Associate each log into a run folder; yields the outcomes in the order of `logs`.

    out : the run folder of a single log, the parent of one folder a log for several; by default
    a folder named after the log in ``runs/``.   reading : keyword arguments of `read_log`.
    extensions : Python files that are run first, in every process.
    watch : wraps the frames of each log to show progress, in a single process only.
    offline : decide identities anew once each log is over.

    Raises UsageError where two logs would get the same folder or an extension fails.
    """
    run_extensions(extensions)
    folders = run_folders(logs, out)
    jobs = [
        (Outcome(log, folder, folder.name if len(logs) > 1 else None), settings, reading, offline)
        for log, folder in zip(logs, folders, strict=True)
    ]
    if workers == 1 or len(jobs) == 1:
        yield from (_associate_one(*job, watch) for job in jobs)
        return
    # Spawned, not forked: a fork would copy locks of threads that the parent may have started.
    with ProcessPoolExecutor(
        min(workers, len(jobs)),
        mp_context=get_context("spawn"),
        initializer=run_extensions,
        initargs=(extensions,),
    ) as pool:
        pending = [pool.submit(_associate_one, *job) for job in jobs]
        for future, job in zip(pending, jobs, strict=True):
            try:
                yield future.result()
            except BrokenProcessPool:
                job[0].error = InternalError(
                    f"{job[0].log}: the worker process died (out of memory?); run this log alone"
                )
                yield job[0]


def run_extensions(files: tuple[Path, ...]) -> None:
    """Run Python files for what they register. Raises UsageError if one cannot be run."""
    for file in files:
        try:
            runpy.run_path(str(file))
        except Exception as error:
            raise UsageError(
                f"the extension {file} failed: {type(error).__name__}: {error}"
            ) from None


def run_folders(logs: list[Path], out: Path | None) -> list[Path]:
    """The run folder of each log."""
    if len(logs) == 1 and out is not None:
        return [out]
    names = _distinct_names(logs)
    return [(out or DEFAULT_OUT) / name for name in names]


def _distinct_names(logs: list[Path]) -> list[str]:
    """Sequence names, with the file's stem behind those that several logs share."""
    names = [_name_of(log) for log in logs]
    shared = {name for name, count in Counter(names).items() if count > 1}
    names = [
        f"{name}-{log.stem}" if name in shared else name
        for name, log in zip(names, logs, strict=True)
    ]
    names = [name.replace("/", "_").replace("\\", "_") for name in names]
    for name, count in Counter(names).items():
        if count > 1:
            twice = [str(log) for log, other in zip(logs, names, strict=True) if other == name]
            raise UsageError(
                f"{' and '.join(twice)} would both be written to '{name}'; run them apart, or "
                "give them a name each in sequence.toml"
            )
    return names


def _name_of(log: Path) -> str:
    try:
        log = locate(log, "detections")
    except InputError:
        return log.stem  # what is wrong with it comes up when it is read
    return name_of(log, read_facts(log))


def _associate_one(
    outcome: Outcome,
    settings: Settings,
    reading: dict[str, Any],
    offline: bool = False,
    watch: Watch | None = None,
) -> Outcome:
    try:
        log = read_log(outcome.log, frame_rate_hz=settings.time.frame_rate_hz, **reading)
        if outcome.name is not None:
            log = replace(log, name=outcome.name)
        outcome.facts = associate_log(log, settings, outcome.folder, offline=offline, watch=watch)
    except MargentError as error:
        outcome.error = error
    return outcome
