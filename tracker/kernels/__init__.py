"""Compiled kernels: arrays in, arrays out, nothing but numpy, numba and math.

Everything else in the package names, checks and orders; nothing in here does.
"""

from __future__ import annotations

import contextlib
from pathlib import Path

STAMP = "kernels.stamp"


def _forget_stale_code(folder: Path) -> None:
    """Delete compiled code that is older than any kernel's source.

    numba compares a compiled function with its own source file only, but it holds copies of the
    functions it calls: after an edit of those it would go on running the old ones.
    """
    sources = sorted(folder.glob("*.py"))
    stamp = "\n".join(f"{path.name} {path.stat().st_mtime_ns}" for path in sources)
    cache = folder / "__pycache__"
    with contextlib.suppress(OSError):  # a folder that cannot be written holds no cache of ours
        if (cache / STAMP).is_file() and (cache / STAMP).read_text() == stamp:
            return
        for compiled in cache.glob("*.nb[ci]"):
            compiled.unlink(missing_ok=True)
        cache.mkdir(exist_ok=True)
        (cache / STAMP).write_text(stamp)


def compiled_before() -> bool:
    """Whether compiled code is kept beside the sources, so that no wait is to be expected.

    False also where numba keeps it elsewhere because the package folder cannot be written.
    """
    return any((Path(__file__).parent / "__pycache__").glob("*.nbi"))


_forget_stale_code(Path(__file__).parent)
