"""Sections that several scenes share: meaning, unit, allowed range and default of each setting.

The sections that one kind of scene needs alone stand beside that scene's code.
"""

from __future__ import annotations

from typing import Annotated

from msgspec import Meta, Struct

from tracker.errors import UsageError
from tracker.settings.fields import NonNegative, Positive, about

Share = Meta(ge=0.0, le=1.0)
ArrivalRate = Meta(gt=0.0, le=3000.0)  # a minute
WarmUp = Meta(ge=0.0, le=3600.0)  # seconds
NonNegativeFloat = Annotated[float, NonNegative]


MOST_ROWS = 50_000_000  # a sequence with more is surely a slip, and would not fit in memory


def check_rows(expected: float, what: str) -> None:
    """Raise UsageError if a sequence would have more than `MOST_ROWS` of something."""
    if expected > MOST_ROWS:
        raise UsageError(f"that would be {expected:.3g} {what}; the limit is {MOST_ROWS:.0e}")


class Section(Struct, frozen=True, forbid_unknown_fields=True, kw_only=True):
    """Base of all sections: immutable, no unknown names."""


class ClockSettings(Section, frozen=True):
    """How long and how often the sensor looks."""

    seconds: Annotated[float, Positive, about("Length of the sequence", "s")] = 20.0
    frame_rate_hz: Annotated[float, Positive, about("Frames (scans) a second", "1/s")] = 12.5


class DetectionSettings(Section, frozen=True):
    """Which present objects are detected.

    P_D = probability x v x h, where v rises with the visible share as a logistic curve
    scaled to 1 at full visibility, and h = size^4 / (size^4 + size_half^4).
    """

    probability: Annotated[float, Share, about("P_D of a large object in full view")] = 0.97
    visibility_half: Annotated[
        float, Share, about("Visible share at the middle of the logistic curve")
    ] = 0.25
    visibility_slope: Annotated[
        float,
        Positive,
        about("Visible share over which the odds of a detection change by e"),
    ] = 0.08
    size_half: Annotated[
        float,
        NonNegative,
        about(
            "Size at which P_D is halved; 0 switches this off",
            "px of height (camera), degrees of width (lidar, radar)",
        ),
    ] = 14.0
    miss_correlation_seconds: Annotated[
        float,
        NonNegative,
        about("Time constant of runs of misses; 0 makes every frame independent", "s"),
    ] = 0.0


class NoiseSettings(Section, frozen=True):
    """Gaussian measurement noise of boxes, in box scales (square root of width times height)."""

    position_sigma: Annotated[
        float, NonNegative, about("Standard deviation of each centre coordinate", "box scales")
    ] = 0.035
    size_sigma: Annotated[
        float, NonNegative, about("Standard deviation of width and height", "box scales")
    ] = 0.045
    occlusion_factor: Annotated[
        float,
        NonNegative,
        about("Sigmas grow by 1 + occlusion_factor x (1 - visible share)"),
    ] = 1.0
    correlation_seconds: Annotated[
        float, NonNegative, about("Time constant of the noise; 0 makes it white", "s")
    ] = 0.0


class ScoreSettings(Section, frozen=True):
    """Scores: 1 / (1 + exp(-g)) of a Gaussian g, one for objects and one for clutter."""

    object_mean: Annotated[float, about("Mean of g for objects in full view", "logits")] = 1.6
    object_sigma: Annotated[float, NonNegative, about("Its standard deviation", "logits")] = 0.8
    visibility_gain: Annotated[
        float, NonNegative, about("The mean falls by this as an object disappears", "logits")
    ] = 2.0
    clutter_mean: Annotated[float, about("Mean of g for clutter", "logits")] = -0.4
    clutter_sigma: Annotated[float, NonNegative, about("Its standard deviation", "logits")] = 0.8


class LabelSettings(Section, frozen=True):
    """Labels and how often they are wrong."""

    error_probability: Annotated[
        float,
        Share,
        about("Chance that a detection has one of the other labels, each as likely"),
    ] = 0.03


class EmbeddingSettings(Section, frozen=True):
    """Appearance vectors of length 1 with a stated separability.

    The cosine of two detections of one object is `same_cosine` on average with a standard
    deviation of (1 - same_cosine) / sqrt(dimension - 1); that of two different objects is 0 on
    average with a standard deviation of 1 / sqrt(dimension).
    """

    dimension: Annotated[
        int, Meta(ge=0, le=512), about("Length of the vector, 2 or more; 0 writes none")
    ] = 0
    same_cosine: Annotated[
        float, Share, about("Mean cosine of two detections of the same object")
    ] = 0.7


class DeliverySettings(Section, frozen=True):
    """How frames get lost, are mistimed and arrive late."""

    outages_per_minute: Annotated[
        float, Meta(ge=0.0, le=600.0), about("Rate at which outages begin", "1/min")
    ] = 0.0
    outage_seconds: Annotated[
        float, Positive, about("Mean length of an outage (exponential)", "s")
    ] = 1.0
    drop_probability: Annotated[float, Share, about("Chance that a frame is lost on its own")] = 0.0
    jitter_sigma_seconds: Annotated[
        float,
        NonNegative,
        about(
            "Standard deviation of capture times, cut at 0.4 frames so that they stay in order", "s"
        ),
    ] = 0.0
    latency_seconds: Annotated[
        float, NonNegative, about("Shortest time between capture and arrival", "s")
    ] = 0.0
    late_probability: Annotated[
        float, Share, about("Chance that a frame is held up on its way")
    ] = 0.0
    late_seconds: Annotated[
        float, NonNegative, about("Mean extra delay of such a frame (exponential)", "s")
    ] = 0.5


class SceneSettings(Section, frozen=True):
    """What every scene has."""

    clock: ClockSettings = ClockSettings()
    delivery: DeliverySettings = DeliverySettings()
    detection: DetectionSettings = DetectionSettings()
    scores: ScoreSettings = ScoreSettings()
    labels: LabelSettings = LabelSettings()
    embedding: EmbeddingSettings = EmbeddingSettings()
