"""Boats in the approach to Tern Quay: straight legs, coordinated turns, changes of speed.

Each boat switches between modes as a continuous-time Markov chain; within a mode it moves in a
coordinated turn (turn rate 0 on a straight leg), and white noise drives its acceleration.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated

import numpy as np
from numpy.typing import NDArray

from tracker.log.model import Codes, Floats, Ints
from tracker.settings.fields import NonNegative, Positive, about
from tracker.simulation.settings import ArrivalRate, Section, Share, WarmUp
from tracker.simulation.streams import Streams, poisson_times
from tracker.simulation.world.movement import Movement, Recorder

LABELS = ("ferry", "launch", "yacht")
STEP_SECONDS = 0.25


class BoatSettings(Section, frozen=True):
    """Size and handling of one kind of boat."""

    share: Annotated[float, NonNegative, about("How many are of this kind, relative to others")]
    length_m: Annotated[float, Positive, about("Length", "m")]
    speed: Annotated[float, Positive, about("Mean speed", "m/s")]
    turn_rate_degrees: Annotated[
        float, NonNegative, about("Fastest turn; each turn draws up to it", "degrees/s")
    ]


class ApproachSettings(Section, frozen=True):
    """The water in front of the quay (at x = 0) and the boats on it."""

    length_m: Annotated[float, Positive, about("Extent in x, away from the quay", "m")] = 4000.0
    width_m: Annotated[float, Positive, about("Extent in y, along the quay", "m")] = 5000.0
    arrivals_per_minute: Annotated[
        float, ArrivalRate, about("Rate at which boats come in at the edges (Poisson)", "1/min")
    ] = 1.6
    warm_up_seconds: Annotated[float, WarmUp, about("Simulated before the first scan", "s")] = 600.0
    straight_seconds: Annotated[
        float, Positive, about("Mean length of a straight leg (exponential)", "s")
    ] = 50.0
    turn_seconds: Annotated[float, Positive, about("Mean length of a turn (exponential)", "s")] = (
        15.0
    )
    speed_change: Annotated[
        float, Share, about("Chance that a new leg comes with a new speed, half to 1.3 of the mean")
    ] = 0.4
    speed_relaxation_seconds: Annotated[
        float, Positive, about("Time in which the speed comes to the wanted one", "s")
    ] = 10.0
    acceleration_noise: Annotated[
        float, NonNegative, about("White noise on the acceleration, both axes", "m/s^1.5")
    ] = 0.05
    ferry: BoatSettings = BoatSettings(share=1.0, length_m=55.0, speed=7.0, turn_rate_degrees=1.2)
    launch: BoatSettings = BoatSettings(share=2.0, length_m=9.0, speed=9.0, turn_rate_degrees=6.0)
    yacht: BoatSettings = BoatSettings(share=2.0, length_m=12.0, speed=4.0, turn_rate_degrees=3.0)


@dataclass(slots=True, eq=False)
class _Boats:
    """(n,) rows, one a boat that ever comes."""

    enters_at: Floats
    label: Codes
    size: Floats  # (n, 3)
    cruise: Floats  # mean speed of its kind
    turn_limit: Floats  # rad/s
    xy: Floats
    velocity: Floats
    turning: Floats  # rad/s, 0 on a straight leg
    wanted: Floats  # m/s
    present: NDArray[np.bool_]
    gone: NDArray[np.bool_]


def sail(settings: ApproachSettings, times: Floats, streams: Streams) -> Movement:
    """Simulate from `warm_up_seconds` before time 0 and record at `times` (sorted, seconds)."""
    begin = -settings.warm_up_seconds
    boats = _arrivals(settings, begin, float(times[-1]), streams)
    rng = streams("sailing")
    recorder = Recorder(times)
    for step in range(int(np.ceil((times[-1] - begin) / STEP_SECONDS)) + 1):
        now = begin + step * STEP_SECONDS
        boats.present |= ~boats.gone & (boats.enters_at <= now)
        active = np.flatnonzero(boats.present)
        before = _state(boats, active)
        _switch(boats, active, settings, rng)
        _advance(boats, active, settings, rng)
        recorder.add(now, now + STEP_SECONDS, active, before, _state(boats, active))
        _leave(boats, active, settings)
    return recorder.movement(boats.size, boats.label)


def _arrivals(settings: ApproachSettings, begin: float, end: float, streams: Streams) -> _Boats:
    times = poisson_times(settings.arrivals_per_minute / 60.0, begin, end, streams("arrivals"))
    count = len(times)
    kinds = (settings.ferry, settings.launch, settings.yacht)
    draws = streams("boats").random((count, 5))
    share = np.array([kind.share for kind in kinds])
    label = np.searchsorted(np.cumsum(share / share.sum()), draws[:, 0]).clip(0, 2).astype(np.int32)
    length = np.array([kind.length_m for kind in kinds])[label]
    cruise = np.array([kind.speed for kind in kinds])[label]
    xy, heading = _entries(settings, draws)
    speed = cruise * (0.8 + 0.4 * draws[:, 4])
    return _Boats(
        enters_at=times,
        label=label,
        size=np.stack((length, 0.3 * length, 0.3 * length), axis=1),
        cruise=cruise,
        turn_limit=np.radians([kind.turn_rate_degrees for kind in kinds])[label],
        xy=xy,
        velocity=speed[:, None] * np.stack((np.cos(heading), np.sin(heading)), axis=1),
        turning=np.zeros(count),
        wanted=speed,
        present=np.zeros(count, bool),
        gone=np.zeros(count, bool),
    )


def _entries(settings: ApproachSettings, draws: Floats) -> tuple[Floats, Floats]:
    """Places along the three edges towards the sea, and headings inwards."""
    length, half = settings.length_m, 0.5 * settings.width_m
    corners = np.array([(0.0, -half), (length, -half), (length, half), (0.0, half)])
    sides = np.concatenate(([0.0], np.cumsum([length, 2.0 * half, length])))
    along = draws[:, 1] * sides[-1]
    x = np.interp(along, sides, corners[:, 0])
    y = np.interp(along, sides, corners[:, 1])
    aim_x, aim_y = length * (0.2 + 0.5 * draws[:, 2]), half * (1.4 * draws[:, 3] - 0.7)
    return np.stack((x, y), axis=1), np.arctan2(aim_y - y, aim_x - x)


def _state(boats: _Boats, active: Ints) -> tuple[Floats, Floats, Floats]:
    velocity = boats.velocity[active]
    return boats.xy[active], velocity, np.arctan2(velocity[:, 1], velocity[:, 0])


def _switch(
    boats: _Boats, active: Ints, settings: ApproachSettings, rng: np.random.Generator
) -> None:
    """Change modes at exponential times."""
    draws = rng.random((len(active), 4))
    straight = boats.turning[active] == 0.0
    stay = np.where(straight, settings.straight_seconds, settings.turn_seconds)
    switches = draws[:, 0] < -np.expm1(-STEP_SECONDS / stay)
    begins, ends = active[switches & straight], active[switches & ~straight]
    chosen = draws[switches & straight]
    rate = boats.turn_limit[begins] * (0.4 + 0.6 * chosen[:, 1])
    boats.turning[begins] = np.where(chosen[:, 2] < 0.5, -rate, rate)
    boats.turning[ends] = 0.0
    chosen = draws[switches & ~straight]
    changes = chosen[:, 1] < settings.speed_change
    new = boats.cruise[ends] * (0.5 + 0.8 * chosen[:, 3])
    boats.wanted[ends] = np.where(changes, new, boats.wanted[ends])


def _advance(
    boats: _Boats, active: Ints, settings: ApproachSettings, rng: np.random.Generator
) -> None:
    """One step: turn the velocity, let the speed relax, add noise; the mean velocity moves it."""
    velocity = boats.velocity[active]
    angle = boats.turning[active] * STEP_SECONDS
    cos, sin = np.cos(angle), np.sin(angle)
    turned = np.stack(
        (velocity[:, 0] * cos - velocity[:, 1] * sin, velocity[:, 0] * sin + velocity[:, 1] * cos),
        axis=1,
    )
    speed = np.sqrt((turned**2).sum(axis=1))
    pull = STEP_SECONDS / settings.speed_relaxation_seconds
    turned *= (1.0 + pull * (boats.wanted[active] / np.maximum(speed, 1e-9) - 1.0))[:, None]
    noise = rng.standard_normal((len(active), 2)) * settings.acceleration_noise
    turned += noise * np.sqrt(STEP_SECONDS)
    boats.xy[active] += 0.5 * STEP_SECONDS * (velocity + turned)
    boats.velocity[active] = turned


def _leave(boats: _Boats, active: Ints, settings: ApproachSettings) -> None:
    """Who crosses an edge of the water is gone."""
    x, y = boats.xy[active].T
    half = 0.5 * settings.width_m
    out = active[(x < 0.0) | (x > settings.length_m) | (np.abs(y) > half)]
    boats.gone[out], boats.present[out] = True, False
