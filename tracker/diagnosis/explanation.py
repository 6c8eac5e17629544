"""What `explain` returns: a tree of plain values, for `text()`, `as_dict()` and the picture.

Numbers are as the run folder has them. Where the ledger left something out and it could be worked
out from predictions and detections, `source` says 'recomputed' instead of 'ledger'. Costs,
margins and force costs are in nats; None stands for what is not known, or, in a margin, for a
decision that nothing could have replaced.
"""

from __future__ import annotations

import dataclasses
import math
from dataclasses import dataclass, field
from typing import Any

LEDGER = "ledger"
RECOMPUTED = "recomputed"


@dataclass(frozen=True, slots=True)
class Gate:
    """One pair against the gate of a tier.

    tail_needed : the pair would have been admitted at P_G ≥ 1 − tail_needed, from the chi-square
    distribution of d².   gate_probability and distance_limit are None where the d² gate is off.
    """

    distance: float
    distance_limit: float | None
    gate_probability: float | None
    tail_needed: float
    overlap: float | None
    overlap_floor: float
    inside: bool
    source: str


@dataclass(frozen=True, slots=True)
class Change:
    """What another answer does to one track, or to a detection that it leaves over.

    track : None for a detection that is left over (new).   before, after : detections, None for a
    miss.
    """

    track: int | None
    before: int | None
    after: int | None


@dataclass(frozen=True, slots=True)
class Alternative:
    """One way to decide about a track or a detection.

    decision : 'pair', 'miss' or 'new'.   force_cost : how much worse the best answer with this is
    than the chosen one, 0 for what was chosen.   held_by : the other track that was given this
    detection.   holds : the other detection that this track was given.   changes : what the best
    answer with this would have changed; worked out for runner-up and 'why not', else empty.
    """

    decision: str
    track: int | None
    detection: int | None
    line: int | None
    chosen: bool
    runner_up: bool
    cost: float | None
    terms: dict[str, float]
    gate: Gate | None
    force_cost: float | None
    odds: str
    held_by: int | None
    holds: int | None
    changes: tuple[Change, ...]
    source: str


@dataclass(frozen=True, slots=True)
class Outside:
    """A pair that took part in the tier but was outside its gate."""

    track: int
    detection: int
    line: int | None
    gate: Gate


@dataclass(frozen=True, slots=True)
class Decision:
    """What one tier decided about a track or a detection.

    margin : how much worse the best answer without this is, None if nothing could replace it.
    component_tracks, component_detections : how many were decided together.
    complete : whether the costs of all alternatives are known.
    """

    decision: str
    tier: int
    tier_name: str
    track: int | None
    detection: int | None
    line: int | None
    margin: float | None
    odds: str
    contested: bool
    component_tracks: int
    component_detections: int
    complete: bool
    alternatives: tuple[Alternative, ...]
    outside: tuple[Outside, ...]

    @property
    def runner_up(self) -> Alternative | None:
        """The best alternative, None if there is none or it is not known."""
        return next((item for item in self.alternatives if item.runner_up), None)


@dataclass(frozen=True, slots=True)
class WhyNot:
    """The answer to 'why not this pair'.

    verdict : 'chosen', 'worse', 'outside gate', 'different tiers', 'already paired' or 'not live'.
    """

    track: int
    detection: int
    line: int | None
    verdict: str
    reason: str
    gate: Gate | None = None
    alternative: Alternative | None = None
    decision: Decision | None = None


@dataclass(frozen=True, slots=True)
class TrackView:
    """A track in the frame.

    state : before the decision, None if it was born in this frame or ended before its detections
    were looked at.   state_after : after it.   position, sigma : where it was expected, by
    coordinate, with standard deviations, measurement noise not included.   covariance : upper
    triangle of the expected position's, row by row.   detection : what it was given, or born
    from.   margin : of that decision, in the last tier it took part in.   afterwards : what became
    of it, in words.
    """

    track: int
    state: str | None
    state_after: str | None
    unseen_seconds: float | None
    position: dict[str, float]
    sigma: dict[str, float]
    covariance: tuple[float, ...]
    detection: int | None
    margin: float | None
    confidence: float | None
    label: str | None
    born_frame: int | None
    confirmed_frame: int | None
    ended_frame: int | None
    afterwards: str


@dataclass(frozen=True, slots=True)
class DetectionView:
    """A detection of the frame; sigma is the measurement noise assumed.

    track : the track that got it, or that it started.   starts_track : whether it started it.
    """

    detection: int
    line: int | None
    score: float | None
    label: str | None
    position: dict[str, float]
    sigma: dict[str, float]
    track: int | None
    starts_track: bool


@dataclass(frozen=True, slots=True)
class Moment:
    """A track in one frame.

    decision : 'pair', 'miss', 'born', 'ended' (before anything was decided) or 'took no part' (in
    any tier).   margin : None if nothing could replace the decision.
    """

    frame: int
    time: float | None
    state: str | None
    decision: str
    detection: int | None
    line: int | None
    margin: float | None
    odds: str
    contested: bool
    confidence: float | None
    events: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class Explanation:
    """Why a frame was decided as it was; see `tracker.diagnosis.explain.explain`.

    track, detection : what was asked about, both None for all contested decisions.
    decisions : one a tier that the subject took part in; or the contested ones, closest first.
    decided, contested, left_out : in the whole frame; contested decisions not among `decisions`.
    tracks, detections : all that are named.   history : the asked track (or the one that got the
    asked detection) in this frame and those around.
    """

    run: str
    folder: str
    kind: str
    ledger_level: str
    contested_margin: float
    frame: int
    time: float | None
    track: int | None
    detection: int | None
    decided: int
    contested: int
    left_out: int
    decisions: tuple[Decision, ...]
    why_not: tuple[WhyNot, ...]
    tracks: tuple[TrackView, ...]
    detections: tuple[DetectionView, ...]
    history: tuple[Moment, ...]
    notes: tuple[str, ...]
    caution: str = field(
        default=(
            "Tracks can be wrong, and a margin measures the model, not the truth. Tracks of people "
            "are personal data: follow the law that applies where you are."
        )
    )

    def as_dict(self) -> dict[str, Any]:
        """The same tree as dictionaries and lists, fit for JSON: numbers that are not finite are
        None."""
        return _plain(dataclasses.asdict(self))

    def text(self) -> str:
        """The explanation in words and tables."""
        from tracker.diagnosis.story import tell

        return tell(self)

    def line_of(self, detection: int | None) -> int | None:
        """Source line of a detection that is named here."""
        view = self.detection_view(detection)
        return None if view is None else view.line

    def track_view(self, track: int | None) -> TrackView | None:
        """The view of a track, None if it is not named here."""
        return next((view for view in self.tracks if view.track == track), None)

    def detection_view(self, detection: int | None) -> DetectionView | None:
        """The view of a detection, None if it is not named here."""
        return next((view for view in self.detections if view.detection == detection), None)


def _plain(value: Any) -> Any:
    if isinstance(value, dict):
        return {key: _plain(item) for key, item in value.items()}
    if isinstance(value, (list, tuple)):
        return [_plain(item) for item in value]
    if isinstance(value, float) and not math.isfinite(value):
        return None
    return value
