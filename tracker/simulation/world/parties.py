"""Who comes to the forecourt: parties of people, bicycles and carts, with their routes."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tracker.log.model import Codes, Floats, Ints
from tracker.simulation.streams import Streams, poisson_times
from tracker.simulation.world.site import BodySettings, SiteSettings, TrafficSettings

LABELS = ("bicycle", "cart", "person")
BICYCLE, CART, PERSON = range(3)
MOST_STOPS = 3
MEMBER_SPACING_M = 0.75
CART_HANDLE_M = 1.15  # who pushes a cart walks this far behind its centre


@dataclass(frozen=True, slots=True, eq=False)
class Crowd:
    """Everyone who ever comes; rows are people and vehicles, in order of arrival.

    leader : (n,) row of the party's leader (its own for leaders).
    place : (n, 2) metres ahead and to the left of the leader.
    enters_at : (n,) seconds.   enters_at_xy : (n, 2).
    route : (n, stops + 1, 2) goals; the last one used, `last`, is the door.
    stays : (n, stops + 1) seconds at each goal.   last : (n,).
    speed : (n,) m/s.   radius : (n,) m.   size : (n, 3).   label : (n,).
    """

    leader: Ints
    place: Floats
    enters_at: Floats
    enters_at_xy: Floats
    route: Floats
    stays: Floats
    last: Ints
    speed: Floats
    radius: Floats
    size: Floats
    label: Codes


def arrive(
    site: SiteSettings, traffic: TrafficSettings, begin: float, end: float, streams: Streams
) -> Crowd:
    """Draw all parties that come in between `begin` and `end` seconds."""
    times = poisson_times(traffic.arrivals_per_minute / 60.0, begin, end, streams("arrivals"))
    count = len(times)
    kinds = streams("parties").random((count, 4))
    members = [member for k in range(count) for member in _party(k, traffic, kinds[k])]
    party = np.array([member[0] for member in members])
    label = np.array([member[1] for member in members], np.int32)
    place = np.array([member[2] for member in members])
    leader = np.searchsorted(party, party)
    entry, route, stays, last = _routes(site, traffic, count, streams)
    pushed = np.isin(party, party[label == CART])
    hurried = np.isin(party, party[label == BICYCLE])
    last = np.where(hurried, 0, last[party])
    route = route[party]
    body = streams("bodies").standard_normal((len(members), 2))
    size, speed = _bodies(traffic, label, body)
    speed = np.where(pushed, speed[leader], speed)
    return Crowd(
        leader=leader,
        place=place,
        enters_at=times[party],
        enters_at_xy=entry[party] + place,
        route=np.where(
            (np.arange(MOST_STOPS + 1) < last[:, None])[..., None], route, route[:, -1:]
        ),
        stays=stays[party],
        last=last,
        speed=speed,
        radius=0.5 * np.sqrt(size[:, 0] * size[:, 1]) * np.where(pushed, 0.5, 1.0),
        size=size,
        label=label,
    )


def _party(
    number: int, traffic: TrafficSettings, draws: Floats
) -> list[tuple[int, int, tuple[float, float]]]:
    """(party, label, place beside the leader) of each member, the leader first."""
    kind, together, more, side = draws.tolist()
    if kind < traffic.bicycle_share:
        return [(number, BICYCLE, (0.0, 0.0))]
    if kind < traffic.bicycle_share + traffic.cart_share:
        return [(number, CART, (0.0, 0.0)), (number, PERSON, (-CART_HANDLE_M, 0.0))]
    people = 1
    if together < traffic.group_share:
        people = 2 + int((traffic.group_limit - 1) * more**2)
    way = MEMBER_SPACING_M if side < 0.5 else -MEMBER_SPACING_M
    places = [(0.0, 0.0), (0.0, way), (-1.2 * MEMBER_SPACING_M, 0.5 * way), (0.0, -way)]
    places += [(-1.2 * MEMBER_SPACING_M * k, way) for k in range(2, 6)]
    return [(number, PERSON, place) for place in places[:people]]


def _routes(
    site: SiteSettings, traffic: TrafficSettings, count: int, streams: Streams
) -> tuple[Floats, Floats, Floats, Ints]:
    """Entry, goals, stays and number of stops of each party; the door is the last goal.

    Every array has a stream of its own, so that more parties change nothing for the first ones.
    """
    doors = np.array([(door.x_m, door.y_m) for door in site.doors])
    weight = np.array([door.weight for door in site.doors])
    pick = streams("doors").random((count, 2))
    enters = np.searchsorted(np.cumsum(weight / weight.sum()), pick[:, 0]).clip(0, len(doors) - 1)
    other = np.where(np.arange(len(doors)) == enters[:, None], 0.0, weight)
    chance = np.cumsum(other, axis=1) / other.sum(axis=1, keepdims=True)
    leaves = (chance < pick[:, 1:]).sum(axis=1).clip(0, len(doors) - 1)
    stops = np.minimum(streams("stops").poisson(traffic.stops_mean, count), MOST_STOPS)
    chosen = streams("places").random((count, MOST_STOPS))
    scatter = streams("scatter").standard_normal((count, MOST_STOPS, 2))
    stays = streams("stays").exponential(traffic.stay_seconds, (count, MOST_STOPS + 1))
    route = np.empty((count, MOST_STOPS + 1, 2))
    route[:, -1] = doors[leaves]
    if site.places:
        places = np.array([(place.x_m, place.y_m) for place in site.places])
        spread = np.array([place.spread_m for place in site.places])
        which = (chosen * len(places)).astype(np.int64)
        route[:, :-1] = places[which] + scatter * spread[which][..., None]
    else:
        stops = np.zeros_like(stops)
    return doors[enters], route, stays, stops


def _bodies(traffic: TrafficSettings, label: Codes, normals: Floats) -> tuple[Floats, Floats]:
    """Sizes (n, 3) and speeds (n,); both within 2.5 standard deviations of the mean."""
    kinds: tuple[BodySettings, ...] = (traffic.bicycle, traffic.cart, traffic.person)
    normals = np.clip(normals, -2.5, 2.5)
    height = np.array([kind.height_m for kind in kinds])[label]
    height_sigma = np.array([kind.height_sigma_m for kind in kinds])[label]
    scale = (height + height_sigma * normals[:, 0]) / height
    size = np.array([(kind.length_m, kind.width_m, kind.height_m) for kind in kinds])[label]
    speed = np.array([kind.speed for kind in kinds])[label]
    speed_sigma = np.array([kind.speed_sigma for kind in kinds])[label]
    speed = np.maximum(speed + speed_sigma * normals[:, 1], 0.2 * speed)
    return size * np.maximum(scale, 0.2)[:, None], speed
