"""Runs without a ledger are run again with one, from their log and their own settings."""

from __future__ import annotations

import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import msgspec

from tracker.errors import InputError
from tracker.log import read_log
from tracker.offline import associate_log
from tracker.results import read_facts
from tracker.settings import load_settings


@contextmanager
def with_ledger(run: Path, log: Path | None) -> Iterator[Path]:
    """Yield a folder of the same run that has a ledger: `run` itself, or a temporary one.

    log : the detection log that the run was made from, needed if it has no ledger.

    Raises InputError if there is neither ledger nor log, or if the log is not the run's.
    """
    settings = load_settings(run / "settings.toml")
    if settings.ledger.level != "none":
        yield run
        return
    if log is None:
        raise InputError(
            "was made without a ledger (ledger.level is 'none')",
            path=run,
            remedy="Give the log it was made from with --log, and it is run again with one.",
        )
    source = read_facts(run)["input"]
    found = read_log(
        log,
        format=source["format"],
        frame_rate_hz=settings.time.frame_rate_hz,
        drop_identities=True,
    )
    if found.digest != source["sha256"]:
        raise InputError(
            f"is not the log that the run {run} was made from ({source['file']}): its contents "
            "differ",
            path=log,
        )
    keeping = msgspec.structs.replace(
        settings, ledger=msgspec.structs.replace(settings.ledger, level="full")
    )
    with tempfile.TemporaryDirectory(prefix="margent-") as folder:
        associate_log(found, keeping, Path(folder) / "run")
        yield Path(folder) / "run"
