"""What is said while work goes on: on standard error, never among the results."""

from __future__ import annotations

import sys
from collections.abc import Iterable, Iterator
from typing import TypeVar

Item = TypeVar("Item")


def announce_compiling() -> None:
    """Say that the first run compiles, where it does."""
    from tracker.kernels import compiled_before

    if not compiled_before():
        print("compiling for this machine, once; this takes some seconds ...", file=sys.stderr)


def watched(items: Iterable[Item], *, total: int, label: str) -> Iterator[Item]:
    """Yield `items`, drawing a bar when standard error is a terminal."""
    if not sys.stderr.isatty():
        yield from items
        return
    from rich.console import Console
    from rich.progress import track

    yield from track(
        items, total=total, description=label, console=Console(stderr=True), transient=True
    )
