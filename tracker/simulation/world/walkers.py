"""People, bicycles and luggage carts who cross the forecourt on foot, alone or together.

A Langevin walker: the velocity relaxes towards the wanted one, neighbours and obstacles push
(the social force of Helbing and Molnár 1995, Phys. Rev. E 51, from memory), and white noise
drives the acceleration. Parties come in at doors as a Poisson process, visit some places, stop
there for a while, and leave by another door.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tracker.log.model import Floats, Ints
from tracker.simulation.streams import Streams
from tracker.simulation.world.movement import Movement, Recorder
from tracker.simulation.world.parties import Crowd, arrive
from tracker.simulation.world.site import SiteSettings, TrafficSettings

STEP_SECONDS = 0.04
ARRIVED_M = 0.9  # so near to a goal counts as there
HEADING_SPEED = 0.2  # m/s; slower walkers keep their heading
FOLLOW_SECONDS = 1.0  # a companion who lags by d metres walks d / FOLLOW_SECONDS faster

Mask = NDArray[np.bool_]


@dataclass(slots=True, eq=False)
class _State:
    """The crowd as it moves; rows are people, (n,) or (n, 2)."""

    xy: Floats
    velocity: Floats
    heading: Floats
    stage: Ints  # which goal of the route is next
    waits_until: Floats
    present: Mask
    gone: Mask


def walk(site: SiteSettings, traffic: TrafficSettings, times: Floats, streams: Streams) -> Movement:
    """Simulate from `warm_up_seconds` before time 0 and record at `times` (sorted, seconds)."""
    begin = -traffic.warm_up_seconds
    steps = int(np.ceil((times[-1] - begin) / STEP_SECONDS)) + 1
    crowd = arrive(site, traffic, begin, float(times[-1]), streams)
    state = _initial(crowd)
    rng = streams("walking")
    recorder = Recorder(times)
    for step in range(steps):
        now = begin + step * STEP_SECONDS
        state.present |= ~state.gone & (crowd.enters_at <= now)
        active = np.flatnonzero(state.present)
        before = (state.xy[active], state.velocity[active], state.heading[active])
        _advance(state, crowd, active, now, site, traffic, rng)
        after = (state.xy[active], state.velocity[active], state.heading[active])
        recorder.add(now, now + STEP_SECONDS, active, before, after)
        _leave(state, crowd, active)
    return recorder.movement(crowd.size, crowd.label)


def _initial(crowd: Crowd) -> _State:
    count = len(crowd.leader)
    towards = crowd.route[:, 0] - crowd.enters_at_xy
    heading = np.arctan2(towards[:, 1], towards[:, 0])
    direction = np.stack((np.cos(heading), np.sin(heading)), axis=-1)
    return _State(
        xy=crowd.enters_at_xy.copy(),
        velocity=direction * crowd.speed[:, None],
        heading=heading,
        stage=np.zeros(count, np.int64),
        waits_until=np.full(count, -np.inf),
        present=np.zeros(count, bool),
        gone=np.zeros(count, bool),
    )


def _advance(
    state: _State,
    crowd: Crowd,
    active: Ints,
    now: float,
    site: SiteSettings,
    traffic: TrafficSettings,
    rng: np.random.Generator,
) -> None:
    """One step of the active people (semi-implicit Euler)."""
    _pause(state, active, now, traffic, rng)
    xy, velocity = state.xy[active], state.velocity[active]
    wanted = _wanted_velocity(state, crowd, active, now)
    push = _push(xy, crowd.radius[active], site, traffic)
    drive = rng.standard_normal((len(active), 2)) * traffic.acceleration_noise
    still = (state.waits_until[active] > now)[:, None]
    acceleration = (wanted - velocity) / traffic.relaxation_seconds + np.where(
        still, 0.3, 1.0
    ) * push
    velocity = velocity + STEP_SECONDS * acceleration
    velocity = velocity + np.where(still, 0.1, 1.0) * drive * np.sqrt(STEP_SECONDS)
    speed = np.sqrt((velocity**2).sum(axis=1))
    limit = 1.3 * crowd.speed[active] + 0.3
    velocity *= (np.minimum(speed, limit) / np.maximum(speed, 1e-9))[:, None]
    state.velocity[active] = velocity
    state.xy[active] = xy + STEP_SECONDS * velocity
    moving = speed > HEADING_SPEED
    turned = active[moving]
    aim = np.arctan2(velocity[moving, 1], velocity[moving, 0]) - state.heading[turned]
    state.heading[turned] += 0.15 * np.arctan2(np.sin(aim), np.cos(aim))


def _pause(
    state: _State, active: Ints, now: float, traffic: TrafficSettings, rng: np.random.Generator
) -> None:
    """Some walkers stop for no visible reason (a Poisson process for each)."""
    chance, length = rng.random(len(active)), rng.exponential(traffic.pause_seconds, len(active))
    rate = traffic.pauses_per_minute / 60.0
    stops = (chance < rate * STEP_SECONDS) & (state.waits_until[active] < now)
    state.waits_until[active[stops]] = now + length[stops]


def _wanted_velocity(state: _State, crowd: Crowd, active: Ints, now: float) -> Floats:
    """(k, 2) towards the next goal, or keeping one's place beside the leader."""
    _reach(state, crowd, active, now)
    goal = crowd.route[active, state.stage[active]]
    leader = crowd.leader[active]
    follows = (leader != active) & state.present[leader]
    beside = state.xy[leader] + _turned(crowd.place[active], state.heading[leader])
    gap = np.where(follows[:, None], beside, goal) - state.xy[active]
    distance = np.maximum(np.sqrt((gap**2).sum(axis=1)), 1e-9)
    speed = np.minimum(crowd.speed[active], distance / FOLLOW_SECONDS)
    wanted = gap / distance[:, None] * np.where(follows, speed, crowd.speed[active])[:, None]
    wanted += np.where(follows[:, None], state.velocity[leader], 0.0)
    still = (state.waits_until[active] > now) & ~follows
    return np.where(still[:, None], 0.0, wanted)


def _reach(state: _State, crowd: Crowd, active: Ints, now: float) -> None:
    """Those at a place of their route stay for a while and then head for the next."""
    gap = crowd.route[active, state.stage[active]] - state.xy[active]
    there = ((gap**2).sum(axis=1) < ARRIVED_M**2) & (state.stage[active] < crowd.last[active])
    arrived = active[there]
    state.waits_until[arrived] = now + crowd.stays[arrived, state.stage[arrived]]
    state.stage[arrived] += 1


def _leave(state: _State, crowd: Crowd, active: Ints) -> None:
    """Who reaches the door at the end of the route is gone; companions then follow on their own."""
    gap = crowd.route[active, crowd.last[active]] - state.xy[active]
    near = (gap**2).sum(axis=1) < ARRIVED_M**2
    leader = crowd.leader[active]
    on_the_way_out = state.gone[leader] | (state.stage[leader] >= crowd.last[leader])
    left = active[near & on_the_way_out]
    state.gone[left] = True
    state.present[left] = False
    orphans = active[state.gone[leader]]
    state.stage[orphans] = crowd.last[orphans]


def _turned(place: Floats, heading: Floats) -> Floats:
    """(k, 2) places given as (ahead, to the left) of a heading, in the world."""
    cos, sin = np.cos(heading), np.sin(heading)
    return np.stack(
        (place[:, 0] * cos - place[:, 1] * sin, place[:, 0] * sin + place[:, 1] * cos), axis=-1
    )


def _push(xy: Floats, radius: Floats, site: SiteSettings, traffic: TrafficSettings) -> Floats:
    """(k, 2) m/s²: exponential repulsion from neighbours and obstacles."""
    gap = xy[:, None, :] - xy[None, :, :]
    force = _repulsion(gap, radius[:, None] + radius[None, :], traffic)
    if not site.obstacles:
        return force
    centre = np.array([(item.x_m, item.y_m) for item in site.obstacles])
    around = np.array([item.radius for item in site.obstacles])
    gap = xy[:, None, :] - centre[None, :, :]
    return force + 2.0 * _repulsion(gap, radius[:, None] + around[None, :], traffic)


def _repulsion(gap: Floats, reach: Floats, traffic: TrafficSettings) -> Floats:
    distance = np.sqrt((gap**2).sum(axis=-1))
    apart = np.minimum((reach - distance) / traffic.push_range_m, 2.0)
    strength = traffic.push * np.exp(apart) / np.maximum(distance, 1e-9)
    return (np.where(distance > 0.0, strength, 0.0)[..., None] * gap).sum(axis=1)
