"""Folders and files that appear complete or not at all."""

from __future__ import annotations

import os
import shutil
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from tracker.errors import OutputError


@contextmanager
def atomic_file(target: Path) -> Iterator[Path]:
    """Yield a temporary file beside `target`, renamed to it at the end, removed on failure.

    Raises OutputError where the file cannot be written.
    """
    working: Path | None = None
    try:
        handle, name = tempfile.mkstemp(
            prefix=f".{target.stem}-", suffix=target.suffix, dir=target.parent
        )
        os.close(handle)
        working = Path(name)
        yield working
        working.chmod(0o644)
        working.replace(target)
    except OSError as error:
        reason = error.strerror or str(error)
        raise OutputError(f"cannot be written: {reason}", path=target) from None
    finally:
        if working is not None:
            working.unlink(missing_ok=True)


@contextmanager
def atomic_folder(target: Path, *, marker: str) -> Iterator[Path]:
    """Yield a temporary folder beside `target`, renamed to it at the end, removed on failure.

    An existing folder is replaced only if it is empty or holds the file `marker`, so that
    nothing but an earlier result of ours is ever overwritten.

    Raises OutputError where the folder cannot be written or must not be replaced.
    """
    if target.exists():
        if not target.is_dir():
            raise OutputError("is a file, not a folder; choose another --out", path=target)
        if any(target.iterdir()) and not (target / marker).is_file():
            raise OutputError(
                f"is a folder with other things in it (no {marker}); choose another --out",
                path=target,
            )
    try:
        target.parent.mkdir(parents=True, exist_ok=True)
        working = Path(tempfile.mkdtemp(prefix=f".{target.name}-", dir=target.parent))
    except OSError as error:
        raise OutputError(f"cannot be written: {error.strerror}", path=target.parent) from None
    try:
        working.chmod(0o755)
        yield working
        _swap(working, target)
    except OSError as error:
        shutil.rmtree(working, ignore_errors=True)
        reason = error.strerror or str(error)
        raise OutputError(
            f"cannot be written: {reason}; nothing is left behind", path=target
        ) from None
    except BaseException:
        shutil.rmtree(working, ignore_errors=True)
        raise


def _swap(working: Path, target: Path) -> None:
    """Put the finished folder in place; an old result goes only once the new one is there."""
    if not target.exists():
        working.rename(target)
        return
    aside = Path(tempfile.mkdtemp(prefix=f".{target.name}-old-", dir=target.parent))
    target.rename(aside / "old")
    try:
        working.rename(target)
    except OSError:
        (aside / "old").rename(target)
        raise
    finally:
        shutil.rmtree(aside, ignore_errors=True)
