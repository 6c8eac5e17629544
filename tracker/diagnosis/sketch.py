"""What a picture of an explanation shows: which parts, where, in which colour, with which words."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

import numpy as np

from tracker.diagnosis.explanation import Decision, DetectionView, Explanation, TrackView
from tracker.diagnosis.picture_labels import Label, along
from tracker.diagnosis.words import nats, odds
from tracker.log.model import Floats, Kind

# Okabe and Ito 2008, "Color Universal Design": told apart with every kind of colour vision. Their
# yellow is left out, hardly to be seen on white; line styles say the same without colour.
TRACK_COLOURS = ("#0072B2", "#D55E00", "#009E73", "#CC79A7", "#E69F00", "#56B4E9")
INK = "#000000"
FAINT = "#8C8C8C"

ROOM = 0.14  # of the region, around it
CONTEXT_NAMED = 8  # things that are not spoken of are named if there are no more
BEST = 4  # alternatives of a decision that the picture is zoomed to


@dataclass(frozen=True, slots=True)
class Link:
    """A line from where a track was expected to a detection."""

    track: int
    detection: int
    style: str  # "chosen", "runner-up", "asked about"
    text: str


class Sketch:
    """What is drawn of an explanation."""

    def __init__(self, told: Explanation) -> None:
        self.told = told
        self.decisions = drawn_decisions(told)
        self.boxes = told.kind == Kind.BOX
        self.tracks = {view.track: view for view in told.tracks if view.position}
        self.detections = {view.detection: view for view in told.detections}
        self.near_tracks, self.near_detections = self._core()
        self.colours = {
            track: TRACK_COLOURS[k % len(TRACK_COLOURS)]
            for k, track in enumerate(sorted(self.near_tracks & set(self.tracks)))
        }
        self.links = list(self._links())
        self.upwards = -1.0 if self.boxes else 1.0  # where y rises: down the page for boxes
        shown = [self.tracks[track].position for track in self.colours]
        shown += [self.detections[number].position for number in self.near_detections]
        self.middle = np.mean([_point(position) for position in shown], axis=0)

    def _core(self) -> tuple[set[int], set[int]]:
        """Tracks and detections that the picture must show; it is zoomed to these."""
        told = self.told
        tracks, detections = {told.track}, {told.detection}
        for item in self.decisions:
            tracks.add(item.track)
            detections.add(item.detection)
            for option in item.alternatives[:BEST]:
                tracks |= {option.track, option.held_by}
                detections.add(option.detection)
            for change in item.runner_up.changes if item.runner_up is not None else ():
                tracks.add(change.track)
                detections |= {change.before, change.after}
            for near in item.outside[:1]:
                tracks.add(near.track)
                detections.add(near.detection)
        for answer in told.why_not:
            tracks.add(answer.track)
            detections.add(answer.detection)
        known = {track for track in tracks if track is not None}
        detections |= {view.detection for view in told.tracks if view.track in known}
        return known, {number for number in detections if number is not None}

    def _links(self) -> Iterator[Link]:
        for track, view in self.tracks.items():
            if track in self.near_tracks and view.detection in self.detections:
                margin = "" if view.margin is None else f"margin {_odds(view.margin)}"
                yield Link(track, view.detection, "chosen", margin)
        seen: set[tuple[int, int]] = set()
        for item in self.decisions:
            best = item.runner_up
            for change in best.changes if best is not None else ():
                if change.track not in self.tracks or change.after is None:
                    continue
                if (change.track, change.after) not in seen and best is not None:
                    seen.add((change.track, change.after))
                    cost = f"runner-up +{_odds(best.force_cost)}"
                    yield Link(change.track, change.after, "runner-up", cost)
        for answer in self.told.why_not:
            pair = (answer.track, answer.detection)
            if answer.track in self.tracks and pair not in seen and answer.verdict != "chosen":
                seen.add(pair)
                option = answer.alternative
                cost = answer.verdict
                if option is not None and option.force_cost is not None:
                    cost = f"+{_odds(option.force_cost)}"
                yield Link(*pair, "asked about", cost)

    def region(self) -> tuple[Floats, Floats]:
        """Lower and upper corner of what must be seen, with room around it."""
        corners = [extent(self.detections[number].position) for number in self.near_detections]
        for track in self.near_tracks & set(self.tracks):
            view = self.tracks[track]
            half = [0.0, 0.0] if self.boxes else _half_axes(self.gate_spread(view))
            corners.append(extent(view.position, *half))
        low = np.min([corner[:2] for corner in corners], axis=0)
        high = np.max([corner[2:] for corner in corners], axis=0)
        room = ROOM * max(*(high - low), 1e-9)
        if not (high > low).any():
            room = max(1.0, 0.1 * float(np.abs(high).max()))  # a single point
        return low - room, high + room

    def labels(self, low: Floats, high: Floats) -> Iterator[Label]:
        """Names at boxes and points, costs at links; then context between corners, if little."""
        for track in sorted(self.colours):
            view = self.tracks[track]
            yield self._name(self._track_text(view), view, self.colours[track])
        for number in sorted(self.near_detections):
            seen = self.detections[number]
            yield self._name(self._detection_text(seen), seen, INK)
        for link in self.links:
            if link.text and link.track in self.colours:
                (x0, y0), (x1, y1) = self.ends(link)
                aside = (self.upwards * (y1 - y0), x1 - x0)
                middle = 0.5 * (x0 + x1), 0.5 * (y0 + y1)
                yield self._label(link.text, *middle, aside, self.colours[link.track])
        context: list[tuple[str, TrackView | DetectionView]] = [
            (f"track {track}", view)
            for track, view in sorted(self.tracks.items())
            if track not in self.near_tracks and _inside(view.position, low, high)
        ]
        context += [
            (f"detection {number}", seen)
            for number, seen in sorted(self.detections.items())
            if number not in self.near_detections and _inside(seen.position, low, high)
        ]
        if len(context) <= CONTEXT_NAMED:
            yield from (self._name(text, item, FAINT) for text, item in context)

    def _name(self, text: str, item: TrackView | DetectionView, colour: str) -> Label:
        """The label of a track, above its box, or of a detection, below it."""
        x, y = _point(item.position)
        upper = isinstance(item, TrackView)
        if self.boxes:
            left, top, right, bottom = extent(item.position)
            x, y = (left, top) if upper else (right, bottom)
        return self._label(text, x, y, (-0.4, 1.0) if upper else (0.4, -1.0), colour)

    def _label(
        self, text: str, x: float, y: float, side: tuple[float, float], colour: str
    ) -> Label:
        """A label that goes to a side for boxes; for points away from the middle of them all."""
        if not self.boxes:
            side = (x - self.middle[0], self.upwards * (y - self.middle[1]))
        length = math.hypot(*side) or 1.0
        return Label(text, float(x), float(y), side[0] / length, side[1] / length, colour)

    def occupied(self, axes: Any) -> list[Any]:
        """Pixels around centres and along links, which labels should leave free."""
        positions = [view.position for view in self.tracks.values()]
        positions += [view.position for view in self.detections.values()]
        found: list[Any] = []
        for position in positions:
            x, y = axes.transData.transform(_point(position))
            found.append((x - 9.0, y - 9.0, x + 9.0, y + 9.0))
        for link in self.links:
            one, other = (axes.transData.transform(end) for end in self.ends(link))
            found += along(one, other)
        return found

    def _track_text(self, view: TrackView) -> str:
        text = f"track {view.track}, {view.state}"
        if view.detection is None:
            margin = "" if view.margin is None else f", margin {_odds(view.margin)}"
            text += f"\nmissed{margin}"
        for item in self.decisions:
            best = item.runner_up
            for change in best.changes if best is not None else ():
                if change.track == view.track and change.after is None and best is not None:
                    return f"{text}\nrunner-up: missed, +{_odds(best.force_cost)}"
        return text

    def _detection_text(self, view: DetectionView) -> str:
        text = f"detection {view.detection}"
        if view.line is not None:
            text += f" (line {view.line})"
        if view.starts_track:
            text += f"\nstarts track {view.track}"
        elif view.track is None:
            text += "\ngiven to no track"
        return text

    def ends(self, link: Link) -> tuple[tuple[float, float], tuple[float, float]]:
        return (
            _point(self.tracks[link.track].position),
            _point(self.detections[link.detection].position),
        )

    def gate_spread(self, view: TrackView) -> Floats:
        """γ S of a point track: the gate is where (z − x)ᵀ (γ S)⁻¹ (z − x) ≤ 1.

        S is with the median noise of the detections shown.
        """
        a, b, c = view.covariance
        noise = [[seen.sigma["x"] ** 2, seen.sigma["y"] ** 2] for seen in self.told.detections]
        spread = np.array([[a, b], [b, c]])
        if noise:
            spread += np.diag(np.median(noise, axis=0))
        return self.gate_limit() * spread

    def gate_limit(self) -> float:
        """d² at the gate's edge, of the first tier that is told of."""
        for item in self.decisions:
            gates = [option.gate for option in item.alternatives]
            gates += [near.gate for near in item.outside]
            for gate in gates:
                if gate is not None and gate.distance_limit is not None:
                    return gate.distance_limit
        return 1.0


def drawn_decisions(told: Explanation) -> list[Decision]:
    """What can be shown in one place: all about one subject; of a frame, the closest decision and
    those that speak of the same tracks or detections."""
    if told.track is not None or told.detection is not None:
        return list(told.decisions)
    drawn = list(told.decisions[:1])
    names = set().union(*(_names(item) for item in drawn))
    grown = True
    while grown:
        fresh = [item for item in told.decisions if item not in drawn and _names(item) & names]
        names |= set().union(*(_names(item) for item in fresh))
        drawn += fresh
        grown = bool(fresh)
    return drawn


def _names(item: Decision) -> set[tuple[str, int | None]]:
    """The tracks and detections of a decision and of its runner-up."""
    found = {("track", item.track), ("detection", item.detection)}
    for change in item.runner_up.changes if item.runner_up is not None else ():
        found |= {("track", change.track), ("detection", change.before)}
        found.add(("detection", change.after))
    return {name for name in found if name[1] is not None}


def _odds(margin: float | None) -> str:
    return f"{nats(margin)} ({odds(margin)})"


def extent(position: dict[str, float], half_x: float = 0.0, half_y: float = 0.0) -> Floats:
    """(left, top, right, bottom) of a box by its centre, or of a point with some room."""
    half_x = 0.5 * position["width"] if "width" in position else half_x
    half_y = 0.5 * position["height"] if "height" in position else half_y
    x, y = position["x"], position["y"]
    return np.array([x - half_x, y - half_y, x + half_x, y + half_y])


def _point(position: dict[str, float]) -> tuple[float, float]:
    return position["x"], position["y"]


def _inside(position: dict[str, float], low: Floats, high: Floats) -> bool:
    return bool(low[0] < position["x"] < high[0] and low[1] < position["y"] < high[1])


def _half_axes(spread: Floats) -> list[float]:
    """Half width and height of the rectangle around an ellipse."""
    return np.sqrt(np.diagonal(spread)).tolist()
