"""Sequences in one process or many; a worker takes whole ones, so results are the same."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from concurrent.futures import ProcessPoolExecutor
from concurrent.futures.process import BrokenProcessPool
from multiprocessing import get_context
from typing import Any, TypeVar

from tracker.errors import InternalError

Found = TypeVar("Found")


def in_processes(
    function: Callable[..., Found], jobs: Mapping[str, tuple[Any, ...]], workers: int
) -> Iterator[tuple[str, Found]]:
    """Call `function` with the arguments of each job; yields (name, result) in their order.

    Raises InternalError where a worker process died.
    """
    if workers == 1 or len(jobs) < 2:
        for name, job in jobs.items():
            yield name, function(*job)
        return
    # Spawned, not forked: a fork would copy locks of threads that the parent may have started.
    with ProcessPoolExecutor(min(workers, len(jobs)), mp_context=get_context("spawn")) as pool:
        pending = {name: pool.submit(function, *job) for name, job in jobs.items()}
        for name, future in pending.items():
            try:
                yield name, future.result()
            except BrokenProcessPool:
                raise InternalError(
                    f"'{name}': the worker process died (out of memory?); try fewer --workers or "
                    "--referee off"
                ) from None
