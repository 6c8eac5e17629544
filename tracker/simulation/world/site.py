"""The forecourt of Tern Quay: doors, places, obstacles, and who comes."""

from __future__ import annotations

from typing import Annotated

import numpy as np
from msgspec import Meta

from tracker.settings.fields import NonNegative, Positive, about
from tracker.simulation.settings import ArrivalRate, Section, Share, WarmUp


class DoorSettings(Section, frozen=True):
    """Where parties come in and leave."""

    name: Annotated[str, about("Name of the door")]
    x_m: Annotated[float, about("Metres to the right of the mast", "m")]
    y_m: Annotated[float, about("Metres away from the mast", "m")]
    weight: Annotated[float, NonNegative, about("How often it is used, relative to others")] = 1.0


class PlaceSettings(Section, frozen=True):
    """Where people stop on their way."""

    name: Annotated[str, about("Name of the place")]
    x_m: Annotated[float, about("Metres to the right of the mast", "m")]
    y_m: Annotated[float, about("Metres away from the mast", "m")]
    spread_m: Annotated[float, NonNegative, about("Standard deviation around it", "m")] = 1.5


class ObstacleSettings(Section, frozen=True):
    """Something that hides and is walked around."""

    name: Annotated[str, about("What it is")]
    x_m: Annotated[float, about("Metres to the right of the mast", "m")]
    y_m: Annotated[float, about("Metres away from the mast", "m")]
    width_m: Annotated[float, Positive, about("Extent in x", "m")]
    depth_m: Annotated[float, Positive, about("Extent in y", "m")]
    height_m: Annotated[float, Positive, about("Height", "m")]

    @property
    def radius(self) -> float:
        """Of the circle around its footprint."""
        return 0.5 * float(np.hypot(self.width_m, self.depth_m))


class SiteSettings(Section, frozen=True):
    """The plan of the forecourt, in metres: x to the right of the mast, y away from it."""

    doors: Annotated[tuple[DoorSettings, ...], Meta(min_length=2)] = (
        DoorSettings(name="terminal west", x_m=-8.0, y_m=33.0, weight=2.0),
        DoorSettings(name="terminal middle", x_m=1.0, y_m=33.0, weight=3.0),
        DoorSettings(name="terminal east", x_m=10.0, y_m=33.0, weight=2.0),
        DoorSettings(name="street north", x_m=-20.0, y_m=25.0, weight=2.0),
        DoorSettings(name="street south", x_m=-13.0, y_m=14.0, weight=2.0),
        DoorSettings(name="gangway", x_m=19.0, y_m=22.0, weight=3.0),
        DoorSettings(name="taxi rank", x_m=12.0, y_m=12.0, weight=1.0),
        DoorSettings(name="under the mast", x_m=-1.0, y_m=7.0, weight=1.0),
    )
    places: tuple[PlaceSettings, ...] = (
        PlaceSettings(name="ticket kiosk", x_m=-3.5, y_m=17.5, spread_m=1.0),
        PlaceSettings(name="benches", x_m=4.5, y_m=17.0, spread_m=1.5),
        PlaceSettings(name="timetable", x_m=3.0, y_m=25.0, spread_m=1.2),
        PlaceSettings(name="open ground", x_m=0.0, y_m=21.0, spread_m=4.5),
    )
    obstacles: tuple[ObstacleSettings, ...] = (
        ObstacleSettings(
            name="ticket kiosk", x_m=-3.5, y_m=20.0, width_m=2.4, depth_m=1.6, height_m=2.5
        ),
        ObstacleSettings(
            name="lamp post", x_m=6.0, y_m=14.5, width_m=0.3, depth_m=0.3, height_m=6.0
        ),
        ObstacleSettings(
            name="timetable", x_m=3.0, y_m=27.0, width_m=1.6, depth_m=0.4, height_m=2.2
        ),
    )


class BodySettings(Section, frozen=True):
    """Size and speed of one kind of object; the height varies from one to the next."""

    length_m: Annotated[float, Positive, about("Along the heading", "m")]
    width_m: Annotated[float, Positive, about("Across the heading", "m")]
    height_m: Annotated[float, Positive, about("Mean height", "m")]
    height_sigma_m: Annotated[float, NonNegative, about("Its standard deviation", "m")]
    speed: Annotated[float, Positive, about("Mean wanted speed", "m/s")]
    speed_sigma: Annotated[float, NonNegative, about("Its standard deviation", "m/s")]


class TrafficSettings(Section, frozen=True):
    """Who comes, how often, and how they move."""

    arrivals_per_minute: Annotated[
        float, ArrivalRate, about("Rate at which parties come in (Poisson process)", "1/min")
    ] = 20.0
    warm_up_seconds: Annotated[
        float,
        WarmUp,
        about("Simulated before the first frame, so that the place is in use", "s"),
    ] = 60.0
    bicycle_share: Annotated[float, Share, about("Share of parties that are one bicycle")] = 0.10
    cart_share: Annotated[
        float, Share, about("Share of parties that are a luggage cart and who pushes it")
    ] = 0.10
    group_share: Annotated[
        float, Share, about("Share of the other parties that are two or more people")
    ] = 0.30
    group_limit: Annotated[int, Meta(ge=2, le=8), about("Most people in a group", "people")] = 4
    stops_mean: Annotated[
        float, NonNegative, about("Mean number of places visited (Poisson, at most 3)")
    ] = 0.8
    stay_seconds: Annotated[
        float, NonNegative, about("Mean stay at a place (exponential)", "s")
    ] = 6.0
    pauses_per_minute: Annotated[
        float, NonNegative, about("Rate at which a walker stops on the way", "1/min")
    ] = 1.5
    pause_seconds: Annotated[
        float, NonNegative, about("Mean length of such a pause (exponential)", "s")
    ] = 2.5
    relaxation_seconds: Annotated[
        float, Positive, about("Time in which the velocity comes to the wanted one", "s")
    ] = 0.6
    acceleration_noise: Annotated[
        float,
        NonNegative,
        about("Square root of the acceleration's power spectral density", "m/s^1.5"),
    ] = 0.25
    push: Annotated[
        float, NonNegative, about("Repulsion of two who touch", "m/s^2", "Helbing and Molnár 1995")
    ] = 2.0
    push_range_m: Annotated[float, Positive, about("Distance over which it falls by e", "m")] = 0.25
    person: BodySettings = BodySettings(
        length_m=0.40, width_m=0.55, height_m=1.71, height_sigma_m=0.09, speed=1.35, speed_sigma=0.2
    )
    bicycle: BodySettings = BodySettings(
        length_m=1.75, width_m=0.55, height_m=1.72, height_sigma_m=0.08, speed=3.6, speed_sigma=0.5
    )
    cart: BodySettings = BodySettings(
        length_m=1.50, width_m=0.80, height_m=1.15, height_sigma_m=0.10, speed=1.1, speed_sigma=0.15
    )
