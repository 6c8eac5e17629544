"""Random numbers by name, so that changing one component leaves every other one as it was."""

from __future__ import annotations

import zlib
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtr

from tracker.errors import UsageError
from tracker.log.model import Floats, Ints


@dataclass(frozen=True, slots=True)
class Streams:
    """Independent generators of one seed: ``streams("clutter")``.

    Each is the child of numpy's `SeedSequence` whose spawn key is a checksum of the name; the
    children do not depend on which others are used or in what order. The same name gives the
    same numbers again.
    """

    seed: int

    def __post_init__(self) -> None:
        if self.seed < 0:
            raise UsageError(f"a seed is 0 or greater, found {self.seed}")

    def __call__(self, component: str) -> np.random.Generator:
        key = zlib.crc32(component.encode())
        return np.random.default_rng(np.random.SeedSequence(self.seed, spawn_key=(key,)))


def correlated_normals(
    rng: np.random.Generator,
    owner: Ints,
    time: Floats,
    correlation_seconds: float,
    columns: int,
) -> Floats:
    """(n, columns) standard normal numbers, correlated over time within each owner.

    A stationary first-order Gauss-Markov process: the correlation after dt seconds is
    exp(-dt / correlation_seconds), none at all if that is 0. Each number taken alone is standard
    normal whatever the correlation, and `rng` gives the same innovations. Rows are sorted by
    time; `owner` is (n,), `time` is (n,) seconds.
    """
    values = rng.standard_normal((len(owner), columns))
    if correlation_seconds <= 0.0 or not len(owner):
        return values
    order = np.argsort(owner, kind="stable")
    first = np.flatnonzero(np.diff(owner[order], prepend=owner[order[0]] - 1))
    place = np.arange(len(order)) - np.repeat(first, np.diff(np.append(first, len(order))))
    by_place = order[np.argsort(place, kind="stable")]
    ends = np.cumsum(np.bincount(place))
    previous = np.empty(len(order), np.int64)
    previous[order[1:]] = order[:-1]
    for start, stop in pairwise(ends.tolist()):
        now = by_place[start:stop]
        before = previous[now]
        kept = np.exp(-(time[now] - time[before]) / correlation_seconds)[:, None]
        values[now] = kept * values[before] + np.sqrt(1.0 - kept**2) * values[now]
    return values


def happens(probability: Floats, normals: Floats) -> NDArray[np.bool_]:
    """(n,) True with the given probabilities, decided by (n,) standard normal numbers."""
    return np.asarray(ndtr(normals) < probability, dtype=bool)


def poisson_times(rate: float, begin: float, end: float, rng: np.random.Generator) -> Floats:
    """Times of a Poisson process, at least one; a later `end` adds some and changes none."""
    times = [begin + rng.exponential(1.0 / rate)]
    while times[-1] < end:
        times.append(times[-1] + rng.exponential(1.0 / rate))
    return np.array(times[:-1] or [begin])
