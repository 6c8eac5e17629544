"""Forklifts and straddle carriers in the loading yard: drive, turn, stop, reverse.

A unicycle with limited turn rate: speed and turn rate relax towards the wanted ones and are
driven by white noise; between stops a vehicle goes in nearly coordinated turns and straight legs.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated

import numpy as np
from msgspec import Meta
from numpy.typing import NDArray

from tracker.log.model import Codes, Floats, Ints
from tracker.settings.fields import NonNegative, Positive, about
from tracker.simulation.settings import ArrivalRate, Section, Share, WarmUp
from tracker.simulation.streams import Streams, poisson_times
from tracker.simulation.world.movement import Movement, Recorder

LABELS = ("carrier", "forklift")
STEP_SECONDS = 0.05
ARRIVED_M = 2.5
SLOW_DOWN_M = 8.0  # vehicles brake over this distance before a stop
STEER_GAIN = 1.5  # wanted turn rate per heading error, 1/s
KEEP_CLEAR_M = 9.0  # twice the distance over which the push away from others falls by e
GIVE_WAY_M = 5.0  # who has less room ahead than this slows down


class VehicleSettings(Section, frozen=True):
    """Size and driving of one kind of vehicle."""

    length_m: Annotated[float, Positive, about("Length", "m")]
    width_m: Annotated[float, Positive, about("Width", "m")]
    height_m: Annotated[float, Positive, about("Height", "m")]
    speed: Annotated[float, Positive, about("Wanted speed on a straight leg", "m/s")]
    turn_rate_degrees: Annotated[float, Positive, about("Fastest turn", "degrees/s")]


class FleetSettings(Section, frozen=True):
    """The yard and the vehicles in it."""

    yard_length_m: Annotated[float, Positive, about("Extent of the yard in x", "m")] = 80.0
    yard_width_m: Annotated[float, Positive, about("Extent of the yard in y", "m")] = 50.0
    arrivals_per_minute: Annotated[
        float, ArrivalRate, about("Rate at which vehicles come in at the gates (Poisson)", "1/min")
    ] = 6.0
    warm_up_seconds: Annotated[float, WarmUp, about("Simulated before the first frame", "s")] = (
        120.0
    )
    carrier_share: Annotated[float, Share, about("Share of vehicles that are carriers")] = 0.3
    stops: Annotated[
        int, Meta(ge=1, le=10), about("Stops of each vehicle before it leaves", "stops")
    ] = 3
    stay_seconds: Annotated[
        float, NonNegative, about("Mean length of a stop (exponential)", "s")
    ] = 6.0
    reverse_seconds: Annotated[
        float, NonNegative, about("Mean time of reversing after a stop (exponential)", "s")
    ] = 2.5
    reverse_speed: Annotated[float, NonNegative, about("Speed of reversing", "m/s")] = 1.2
    acceleration_noise: Annotated[
        float, NonNegative, about("White noise on the speed", "m/s^1.5")
    ] = 0.15
    turn_noise_degrees: Annotated[
        float, NonNegative, about("White noise on the turn rate", "degrees/s^1.5")
    ] = 4.0
    speed_relaxation_seconds: Annotated[
        float, Positive, about("Time in which the speed comes to the wanted one", "s")
    ] = 1.0
    turn_relaxation_seconds: Annotated[
        float, Positive, about("Time in which the turn rate comes to the wanted one", "s")
    ] = 0.4
    carrier: VehicleSettings = VehicleSettings(
        length_m=9.2, width_m=4.9, height_m=9.0, speed=4.5, turn_rate_degrees=22.0
    )
    forklift: VehicleSettings = VehicleSettings(
        length_m=3.2, width_m=1.4, height_m=2.2, speed=3.5, turn_rate_degrees=55.0
    )


@dataclass(slots=True, eq=False)
class _Fleet:
    """Everything about each vehicle that ever comes, (n,) rows; the last goal is the gate out."""

    enters_at: Floats
    route: Floats  # (n, stops + 1, 2)
    stays: Floats  # (n, stops + 1) s
    reverses: Floats  # (n, stops + 1) s, the sign is the side to which it turns
    label: Codes
    size: Floats  # (n, 3)
    speed: Floats
    turn_rate: Floats
    xy: Floats
    heading: Floats
    velocity: Floats  # along the heading, m/s
    turning: Floats  # rad/s
    stage: Ints
    waits_until: Floats
    reverses_until: Floats
    present: NDArray[np.bool_]
    gone: NDArray[np.bool_]


def drive(settings: FleetSettings, times: Floats, streams: Streams) -> Movement:
    """Simulate from `warm_up_seconds` before time 0 and record at `times` (sorted, seconds)."""
    begin = -settings.warm_up_seconds
    fleet = _arrivals(settings, begin, float(times[-1]), streams)
    rng = streams("driving")
    recorder = Recorder(times)
    for step in range(int(np.ceil((times[-1] - begin) / STEP_SECONDS)) + 1):
        now = begin + step * STEP_SECONDS
        fleet.present |= ~fleet.gone & (fleet.enters_at <= now)
        active = np.flatnonzero(fleet.present)
        before = _state(fleet, active)
        _advance(fleet, active, now, settings, rng)
        recorder.add(now, now + STEP_SECONDS, active, before, _state(fleet, active))
        _next_stage(fleet, active, now)
    return recorder.movement(fleet.size, fleet.label)


def _arrivals(settings: FleetSettings, begin: float, end: float, streams: Streams) -> _Fleet:
    times = poisson_times(settings.arrivals_per_minute / 60.0, begin, end, streams("arrivals"))
    count, goals = len(times), settings.stops + 1
    length, width = settings.yard_length_m, settings.yard_width_m
    kinds = (settings.carrier, settings.forklift)
    draws = streams("fleet").random((count, 4))
    label = np.where(draws[:, 0] < settings.carrier_share, 0, 1).astype(np.int32)
    gates = np.array([(0.0, 0.3 * width), (0.0, 0.8 * width), (length, 0.5 * width)])
    route = streams("stops").random((count, goals, 2)) * (0.8 * np.array([length, width]))
    route += 0.1 * np.array([length, width])
    route[:, -1] = gates[(draws[:, 1] * len(gates)).astype(np.int64)]
    entry = gates[(draws[:, 2] * len(gates)).astype(np.int64)]
    towards = route[:, 0] - entry
    side = np.where(streams("sides").random((count, goals)) < 0.5, -1.0, 1.0)
    return _Fleet(
        enters_at=times,
        route=route,
        stays=streams("stays").exponential(settings.stay_seconds, (count, goals)),
        reverses=side * streams("reverses").exponential(settings.reverse_seconds, (count, goals)),
        label=label,
        size=np.array([(kind.length_m, kind.width_m, kind.height_m) for kind in kinds])[label],
        speed=np.array([kind.speed for kind in kinds])[label],
        turn_rate=np.radians([kind.turn_rate_degrees for kind in kinds])[label],
        xy=entry,
        heading=np.arctan2(towards[:, 1], towards[:, 0]),
        velocity=np.zeros(count),
        turning=np.zeros(count),
        stage=np.zeros(count, np.int64),
        waits_until=np.full(count, -np.inf),
        reverses_until=np.full(count, -np.inf),
        present=np.zeros(count, bool),
        gone=np.zeros(count, bool),
    )


def _state(fleet: _Fleet, active: Ints) -> tuple[Floats, Floats, Floats]:
    heading = fleet.heading[active]
    direction = np.stack((np.cos(heading), np.sin(heading)), axis=-1)
    return fleet.xy[active], fleet.velocity[active, None] * direction, heading


def _advance(
    fleet: _Fleet, active: Ints, now: float, settings: FleetSettings, rng: np.random.Generator
) -> None:
    speed, turn = _wanted(fleet, active, now, settings)
    noise = rng.standard_normal((len(active), 2)) * np.sqrt(STEP_SECONDS)
    still = fleet.waits_until[active] > now
    noise[still] = 0.0
    velocity, turning = fleet.velocity[active], fleet.turning[active]
    velocity = velocity + STEP_SECONDS * (speed - velocity) / settings.speed_relaxation_seconds
    velocity = velocity + settings.acceleration_noise * noise[:, 0]
    turning = turning + STEP_SECONDS * (turn - turning) / settings.turn_relaxation_seconds
    turning = turning + np.radians(settings.turn_noise_degrees) * noise[:, 1]
    limit = fleet.turn_rate[active]
    turning = np.where(still, 0.0, np.clip(turning, -limit, limit))
    heading = fleet.heading[active] + 0.5 * STEP_SECONDS * turning
    direction = np.stack((np.cos(heading), np.sin(heading)), axis=-1)
    fleet.xy[active] += STEP_SECONDS * velocity[:, None] * direction
    fleet.heading[active] = heading + 0.5 * STEP_SECONDS * turning
    fleet.velocity[active], fleet.turning[active] = velocity, turning


def _wanted(
    fleet: _Fleet, active: Ints, now: float, settings: FleetSettings
) -> tuple[Floats, Floats]:
    """(k,) speed and turn rate that the drivers want."""
    stage = fleet.stage[active]
    gap = fleet.route[active, stage] - fleet.xy[active]
    distance = np.sqrt((gap**2).sum(axis=1))
    course = gap / np.maximum(distance, 1e-9)[:, None] + _keep_clear(fleet, active)
    error = np.arctan2(course[:, 1], course[:, 0]) - fleet.heading[active]
    error = np.arctan2(np.sin(error), np.cos(error))
    turn = np.clip(STEER_GAIN * error, -fleet.turn_rate[active], fleet.turn_rate[active])
    slow = np.where(stage < settings.stops, np.minimum(distance / SLOW_DOWN_M, 1.0), 1.0)
    speed = fleet.speed[active] * np.maximum(np.cos(error), 0.2) * np.maximum(slow, 0.15)
    speed *= _giving_way(fleet, active)
    backwards = fleet.reverses_until[active] > now
    side = np.sign(fleet.reverses[active, stage - 1])
    speed = np.where(backwards, -settings.reverse_speed, speed)
    turn = np.where(backwards, 0.4 * side * fleet.turn_rate[active], turn)
    still = fleet.waits_until[active] > now
    return np.where(still, 0.0, speed), np.where(still, 0.0, turn)


def _keep_clear(fleet: _Fleet, active: Ints) -> Floats:
    """(k, 2) push of the course away from others, and to the right, so that two who meet pass."""
    gap = fleet.xy[active][:, None, :] - fleet.xy[active][None, :, :]
    distance = np.sqrt((gap**2).sum(axis=-1))
    strength = np.where(distance > 0.0, np.exp(-2.0 * distance / KEEP_CLEAR_M), 0.0)
    away = gap / np.maximum(distance, 1e-9)[..., None]
    right = np.stack((-away[..., 1], away[..., 0]), axis=-1)
    return (3.0 * strength[..., None] * (away + 0.5 * right)).sum(axis=1)


def _giving_way(fleet: _Fleet, active: Ints) -> Floats:
    """(k,) share of the speed left by those ahead who came earlier (they do not give way back)."""
    gap = fleet.xy[active][None, :, :] - fleet.xy[active][:, None, :]
    distance = np.sqrt((gap**2).sum(axis=-1))
    heading = fleet.heading[active]
    ahead = gap[..., 0] * np.cos(heading)[:, None] + gap[..., 1] * np.sin(heading)[:, None]
    length = fleet.size[active, 0]
    room = distance - 0.5 * (length[:, None] + length[None, :])
    blocked = (ahead > 0.5 * distance) & (active[None, :] < active[:, None])
    return np.where(blocked, np.clip(room / GIVE_WAY_M, 0.0, 1.0), 1.0).min(axis=1, initial=1.0)


def _next_stage(fleet: _Fleet, active: Ints, now: float) -> None:
    """Stop at a goal, then reverse and head for the next; at the gate, be gone."""
    stage = fleet.stage[active]
    gap = fleet.route[active, stage] - fleet.xy[active]
    there = (gap**2).sum(axis=1) < ARRIVED_M**2
    last = fleet.route.shape[1] - 1
    out = active[there & (stage == last)]
    fleet.gone[out], fleet.present[out] = True, False
    stops = active[there & (stage < last)]
    leaves_at = now + fleet.stays[stops, fleet.stage[stops]]
    fleet.waits_until[stops] = leaves_at
    fleet.reverses_until[stops] = leaves_at + np.abs(fleet.reverses[stops, fleet.stage[stops]])
    fleet.stage[stops] += 1
