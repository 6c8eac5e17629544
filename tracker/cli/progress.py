"""A progress bar on standard error, only where a person is watching."""

from __future__ import annotations

import sys
from collections.abc import Iterable, Iterator
from typing import TypeVar

Item = TypeVar("Item")


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
