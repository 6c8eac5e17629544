"""What every world hands to its sensor: where each object is at each frame."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tracker.log.model import Codes, Floats, Ints


@dataclass(frozen=True, slots=True, eq=False)
class Movement:
    """One row an object and frame, sorted by (frame, object).

    frame : (n,) index into the frame times.   object : (n,) row of `size` and `label`.
    xy : (n, 2) metres, or the world's own unit.   velocity : (n, 2) the same per second.
    heading : (n,) radians from x towards y.
    size : (objects, 3) length, width, height.   label : (objects,) codes.
    """

    frame: Ints
    object: Ints
    xy: Floats
    velocity: Floats
    heading: Floats
    size: Floats
    label: Codes

    def __len__(self) -> int:
        return len(self.frame)

    def select(self, wanted: NDArray[np.bool_] | Ints) -> Movement:
        """Only the wanted rows, a mask or indices; objects keep their numbers."""
        return Movement(
            self.frame[wanted],
            self.object[wanted],
            self.xy[wanted],
            self.velocity[wanted],
            self.heading[wanted],
            self.size,
            self.label,
        )

    def numbered(self) -> tuple[Movement, Ints]:
        """The rows sorted by (frame, number), and (n,) numbers from 1 by first appearance."""
        owners, first, index = np.unique(self.object, return_index=True, return_inverse=True)
        rank = np.empty(len(owners), np.int64)
        rank[np.argsort(first, kind="stable")] = np.arange(1, len(owners) + 1)
        number = rank[index]
        order = np.lexsort((number, self.frame))
        return self.select(order), number[order]


class Recorder:
    """Collects the state of a world that moves in small steps, interpolated to the frame times."""

    def __init__(self, times: Floats) -> None:
        self._times = times
        self._next = 0
        self._rows: list[tuple[Ints, Ints, Floats, Floats, Floats]] = []

    def add(
        self,
        start: float,
        stop: float,
        active: Ints,
        before: tuple[Floats, Floats, Floats],
        after: tuple[Floats, Floats, Floats],
    ) -> None:
        """Record the frames in [start, stop).

        active : (k,) objects; before, after : their position (k, 2), velocity (k, 2) and heading
        (k,) at both ends. Positions are interpolated linearly: within a step of a few hundredths
        of a second the difference to the true curve is below a millimetre.
        """
        while self._next < len(self._times) and self._times[self._next] < stop:
            share = (self._times[self._next] - start) / (stop - start)
            xy, velocity = (before[k] + share * (after[k] - before[k]) for k in (0, 1))
            turn = np.arctan2(np.sin(after[2] - before[2]), np.cos(after[2] - before[2]))
            frame = np.full(len(active), self._next)
            self._rows.append((frame, active, xy, velocity, before[2] + share * turn))
            self._next += 1

    def movement(self, size: Floats, label: Codes) -> Movement:
        frame, owner, xy, velocity, heading = (
            np.concatenate(column) for column in zip(*self._rows, strict=True)
        )
        return Movement(frame, owner, xy, velocity, heading, size, label)
