"""Any number of objects at constant density, moving exactly as the constant-velocity model says."""

from __future__ import annotations

from typing import Annotated, Literal

import numpy as np
from msgspec import Meta

from tracker.log.model import Floats, Ints
from tracker.settings.fields import NonNegative, Positive, about
from tracker.simulation.settings import Section, check_rows
from tracker.simulation.streams import Streams
from tracker.simulation.world.movement import Movement


class DriftSettings(Section, frozen=True):
    """A square field whose side grows with the number of objects."""

    kind: Annotated[Literal["box", "point"], about("What is measured")] = "box"
    objects: Annotated[
        int, Meta(ge=1, le=10_000_000), about("Objects present at any time", "objects")
    ] = 1000
    spacing: Annotated[
        float, Positive, about("Square root of the area per object", "px (or length units)")
    ] = 120.0
    size: Annotated[
        float, Positive, about("Mean square root of width times height of boxes", "px")
    ] = 50.0
    size_spread: Annotated[
        float, NonNegative, about("Standard deviation of the logarithm of width and of height")
    ] = 0.2
    speed_sigma: Annotated[
        float, NonNegative, about("Standard deviation of each velocity component at first", "px/s")
    ] = 60.0
    acceleration_noise: Annotated[
        float,
        NonNegative,
        about(
            "Square root of the acceleration's power spectral density",
            "px/s^1.5",
            "Bar-Shalom, Li and Kirubarajan 2001, ch. 6",
        ),
    ] = 25.0
    life_seconds: Annotated[
        float,
        NonNegative,
        about(
            "Mean life of an object (exponential), then another takes its place; 0 is for ever", "s"
        ),
    ] = 30.0
    clutter_per_object: Annotated[
        float, NonNegative, about("Mean number of false detections a frame and object (Poisson)")
    ] = 0.05

    @property
    def side(self) -> float:
        """Of the field, in the unit of `spacing`."""
        return self.spacing * float(np.sqrt(self.objects))


def drift(settings: DriftSettings, times: Floats, streams: Streams) -> Movement:
    """Constant velocity driven by continuous white-noise acceleration, reflected at the edges.

    Between frames dt apart, per axis: [x, v] += [v dt, 0] + noise of covariance
    q [dt^3/3, dt^2/2; dt^2/2, dt], q = acceleration_noise^2 (exact, no small steps).

    Raises UsageError for more rows than fit in memory.
    """
    count = settings.objects
    check_rows(float(count) * len(times), "true objects")
    noise, lives, births = streams("drift"), streams("lives"), streams("births")
    xy, velocity = _born(settings, count, births)
    identity = np.arange(count)
    total = count
    rows: list[tuple[Ints, Floats, Floats]] = [(identity, xy, velocity)]
    for dt in np.diff(times).tolist():
        normals = noise.standard_normal((count, 4))
        xy, velocity = _moved(xy, velocity, dt, settings, normals)
        identity = identity.copy()
        if settings.life_seconds > 0.0:
            dies = np.flatnonzero(lives.random(count) < -np.expm1(-dt / settings.life_seconds))
            xy[dies], velocity[dies] = _born(settings, len(dies), births)
            identity[dies] = total + np.arange(len(dies))
            total += len(dies)
        rows.append((identity, xy, velocity))
    owner, place, speed = (np.concatenate(column) for column in zip(*rows, strict=True))
    sizes = np.exp(settings.size_spread * streams("sizes").standard_normal((total, 2)))
    return Movement(
        frame=np.repeat(np.arange(len(times)), count),
        object=owner,
        xy=place,
        velocity=speed,
        heading=np.zeros(len(owner)),
        size=np.column_stack((settings.size * sizes, np.zeros(total))),
        label=np.zeros(total, np.int32),
    )


def _born(settings: DriftSettings, count: int, rng: np.random.Generator) -> tuple[Floats, Floats]:
    """Places uniform over the field, velocities normal."""
    xy = rng.random((count, 2)) * settings.side
    return xy, rng.standard_normal((count, 2)) * settings.speed_sigma


def _moved(
    xy: Floats, velocity: Floats, dt: float, settings: DriftSettings, normals: Floats
) -> tuple[Floats, Floats]:
    # Cholesky factor of [dt^3/3, dt^2/2; dt^2/2, dt], velocity first.
    push = settings.acceleration_noise * np.sqrt(dt)
    first, second = normals[:, :2], normals[:, 2:]
    moved = xy + dt * velocity + push * dt * (0.5 * first + np.sqrt(1.0 / 12.0) * second)
    velocity = velocity + push * first
    side = settings.side
    folded = np.mod(moved, 2.0 * side)
    back = folded > side
    return np.where(back, 2.0 * side - folded, folded), np.where(back, -velocity, velocity)
