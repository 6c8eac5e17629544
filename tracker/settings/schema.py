"""Every setting: meaning, unit, allowed range, default, and where the idea comes from.

Settings are immutable and complete: a default is a value like any other, and the whole set is
written into each run folder. Files, overrides and `--print-settings` are in `files.py`.
"""

from __future__ import annotations

from typing import Annotated, Literal

from msgspec import Meta

from tracker.settings.fields import (
    NonNegative,
    Positive,
    PositiveFloat,
    Probability,
    ProbabilityFloat,
    Section,
    about,
)
from tracker.settings.hindsight import HindsightSettings
from tracker.settings.lifecycle import LifecycleSettings


class TimeSettings(Section):
    """How frame numbers become seconds."""

    frame_rate_hz: Annotated[
        PositiveFloat | None,
        about("Frame rate of logs that have frame numbers only; sequence.toml goes first", "1/s"),
    ] = None
    absent_frames: Annotated[
        Literal["not-scanned", "scanned"],
        about(
            "A frame number missing from the log: 'not-scanned' predicts across it, 'scanned' "
            "means that the detector looked and saw nothing, so tracks miss"
        ),
    ] = "not-scanned"


class SensorSettings(Section):
    """What is known of the detector."""

    detection_probability: Annotated[
        float, Probability, about("P_D: chance that a present object is detected in a frame")
    ] = 0.9
    hidden_below: Annotated[
        ProbabilityFloat | None,
        about(
            "Boxes: a track of whose box less than this share is visible, the rest being behind "
            "a nearer one (lower in the image), is detected in proportion less; none: all alike"
        ),
    ] = None
    score_floor: Annotated[
        float | None, about("Detections scored below this are not used at all", "score")
    ] = None


class MotionSettings(Section):
    """Constant velocity driven by continuous white-noise acceleration.

    For boxes all three are in box scales (square root of width times height), so that near and
    far objects are treated alike; for points they are in the log's own length unit.
    """

    acceleration_noise: Annotated[
        float,
        NonNegative,
        about(
            "Square root of the acceleration's power spectral density",
            "box scales (or length units) per s^1.5",
            "Bar-Shalom, Li and Kirubarajan 2001, ch. 6",
        ),
    ] = 1.0
    size_noise: Annotated[
        float,
        NonNegative,
        about("The same for width and height", "box scales per s^1.5"),
    ] = 0.15
    initial_speed_sigma: Annotated[
        float,
        Positive,
        about("Standard deviation of a new track's velocity", "box scales (or length units) / s"),
    ] = 1.5
    initial_size_rate_sigma: Annotated[
        float, Positive, about("Standard deviation of a new track's size rates", "box scales / s")
    ] = 0.2


class CameraSettings(Section):
    """A camera that moves: boxes only."""

    motion: Annotated[
        Literal["estimated", "still"],
        about(
            "'estimated' finds shift, zoom and rotation of the image from the detections and "
            "moves the tracks with it, as far as it has seen the camera move; 'still' leaves "
            "them alone. Points are always still"
        ),
    ] = "estimated"
    reach: Annotated[
        float,
        Positive,
        about("Farthest that an object is looked for beside its prediction", "box scales"),
    ] = 2.0
    shift_sigma: Annotated[
        float, Positive, about("Standard deviation of a jolt's shift", "box scales per frame")
    ] = 0.3
    turn_sigma: Annotated[
        float, Positive, about("The same of its rotation, and of its zoom as a ratio", "radians")
    ] = 0.02
    jolt_nats: Annotated[
        float, NonNegative, about("Evidence at which a jolt is believed at once", "nats")
    ] = 8.0


class MeasurementSettings(Section):
    """Noise of one detection, where the log has no sigma_* columns."""

    unit: Annotated[
        Literal["auto", "box-scales", "absolute"],
        about(
            "Unit of the two sigmas: 'box-scales' multiplies by the square root of width times "
            "height; 'auto' is box-scales for boxes, absolute for points"
        ),
    ] = "auto"
    position_sigma: Annotated[
        float, Positive, about("Standard deviation of the centre or point", "see unit")
    ] = 0.07
    size_sigma: Annotated[
        float, Positive, about("Standard deviation of width and height", "see unit")
    ] = 0.1


class GateSettings(Section):
    """Which pairs are considered at all."""

    probability: Annotated[
        ProbabilityFloat | None,
        about(
            "P_G: chance that the true detection falls inside the d² gate; none switches the d² "
            "gate off (boxes with an overlap floor only)",
            "",
            "chi-square quantile, NIST/SEMATECH e-Handbook 1.3.6.7.4",
        ),
    ] = 0.999
    overlap_floor: Annotated[
        Annotated[float, Meta(ge=0.0, lt=1.0)] | None,
        about(
            "Boxes: least IoU of a candidate, so that boxes that hardly touch are no rivals; 0 "
            "switches it off. None is 0.1 for boxes"
        ),
    ] = None
    candidate_limit: Annotated[
        int,
        Meta(ge=1_000),
        about("Most candidate pairs in one frame before the run stops with an error", "pairs"),
    ] = 50_000_000


class OverlapSettings(Section):
    """IoU as evidence: cost = nats x (neutral - IoU)."""

    nats: Annotated[
        float, Positive, about("How much evidence the whole range of IoU carries", "nats")
    ] = 8.0
    neutral: Annotated[
        float, Meta(ge=0.0, le=1.0), about("IoU that speaks neither for nor against the pair")
    ] = 0.5


class GeneralisedOverlapSettings(Section):
    """Generalised IoU, from -1 to 1, as evidence: cost = nats x (neutral - GIoU)."""

    nats: Annotated[
        float, Positive, about("Evidence a unit of generalised IoU carries", "nats")
    ] = 5.0
    neutral: Annotated[
        float, Meta(ge=-1.0, le=1.0), about("Value that speaks neither for nor against the pair")
    ] = 0.3


class LabelSettings(Section):
    """Labels as evidence; a detection or track without label says nothing."""

    agree_nats: Annotated[
        float, NonNegative, about("Evidence for the pair if its labels agree", "nats")
    ] = 0.0
    differ_nats: Annotated[
        float, NonNegative, about("Evidence against it if they differ", "nats")
    ] = 3.0


class AppearanceSettings(Section):
    """Cosine similarity of embeddings as evidence: cost = nats x (neutral - cosine)."""

    nats: Annotated[
        float, Positive, about("Evidence a unit of cosine similarity carries", "nats")
    ] = 6.0
    neutral: Annotated[
        float, Meta(ge=-1.0, le=1.0), about("Cosine that speaks neither for nor against the pair")
    ] = 0.5
    memory: Annotated[
        float,
        Meta(ge=0.0, lt=1.0),
        about("Weight of the past in a track's running mean embedding, at each detection"),
    ] = 0.9


class CostSettings(Section):
    """What a pair costs, in nats: minus the log-likelihood ratio of 'same' against 'new'."""

    terms: Annotated[
        tuple[str, ...],
        Meta(min_length=1),
        about(
            "Terms that are added: overlap or generalised-overlap (boxes), mahalanobis (half of "
            "d² minus the gate), likelihood (half of d², log-volume of S, new_density), label, "
            "appearance (embedding_* columns), or the name of a registered function; auto is "
            "likelihood, but mahalanobis for points without new_density",
            "",
            "Sittler 1964; Blackman and Popoli 1999",
        ),
    ] = ("auto",)
    overlap: OverlapSettings = OverlapSettings()
    generalised_overlap: GeneralisedOverlapSettings = GeneralisedOverlapSettings()
    label: LabelSettings = LabelSettings()
    appearance: AppearanceSettings = AppearanceSettings()
    new_density: Annotated[
        PositiveFloat | None,
        about(
            "Density of new objects and clutter in measurement space, needed by likelihood; none "
            "is 0.135 for boxes",
            "per frame and unit of area (points), or box scale to the fourth (boxes)",
        ),
    ] = None


EXACT_LIMIT_MOST = 18  # time and memory double with each: some tenths of a second there


class AssociationSettings(Section):
    """What corrects a track: its own detection, or all that might be its own.

    Joint-probabilistic mode weighs all joint events of a frame (Fortmann, Bar-Shalom and Scheffe
    1983) and corrects each track by the weighted combination of its candidates. The weights are
    probabilities if costs are log-likelihood ratios, that is with the 'likelihood' cost; overlap
    and mahalanobis costs make pseudo-probabilities of them. Which detection a track is paired
    with, births and lifecycle follow the best assignment in both modes.

    It is made for clutter (radar, sonar), where it loses fewer tracks. Known limit: tracks that
    stay close together are drawn into one another (coalescence), so that in crowds, above all
    with a cost that is no likelihood, identities switch more often than in 'best' mode.
    """

    mode: Annotated[
        Literal["best", "joint-probabilistic"],
        about(
            "'best' corrects a track by the detection of the best assignment; "
            "'joint-probabilistic' by all its candidates, each weighted by its probability over "
            "all joint assignments, which needs the 'likelihood' cost to be one",
            "",
            "Fortmann, Bar-Shalom and Scheffe 1983",
        ),
    ] = "best"
    exact_limit: Annotated[
        int,
        Meta(ge=1, le=EXACT_LIMIT_MOST),
        about(
            "Joint mode: components in which more detections (or tracks) than this are open at "
            "once are not summed exactly; time and memory double with each",
            "detections (or tracks)",
        ),
    ] = 14
    ranked: Annotated[
        int,
        Meta(ge=1, le=100_000),
        about(
            "Joint mode: beyond exact_limit this many best assignments stand for all",
            "assignments",
            "Murty 1968",
        ),
    ] = 100


StateName = Literal["tentative", "confirmed", "coasting"]


class TierSettings(Section):
    """One pass of association over what earlier passes left unpaired.

    Confident detections first and weak ones only to keep tracks alive is hysteresis: a high
    threshold to start, a low one to continue (Canny 1986, for edges; from memory).
    """

    name: Annotated[str, about("What the ledger calls this tier")] = "all"
    score_from: Annotated[
        float | None, about("Detections scored at or above this take part", "score")
    ] = None
    score_below: Annotated[
        float | None, about("Detections scored below this take part", "score")
    ] = None
    states: Annotated[
        tuple[StateName, ...], Meta(min_length=1), about("Tracks in these states take part")
    ] = ("tentative", "confirmed", "coasting")
    gate: Annotated[GateSettings | None, about("Gate of this tier; none is [gate]")] = None
    cost: Annotated[CostSettings | None, about("Cost of this tier; none is [cost]")] = None


class OutputSettings(Section):
    """Which rows of tracks.csv count as reported, and what they say."""

    position: Annotated[
        Literal["auto", "detected", "estimated"],
        about(
            "What a row with a detection shows: the detection itself or the filtered estimate; "
            "'auto' is detected for boxes, estimated for points (tracks.parquet has both)"
        ),
    ] = "auto"

    report_before_confirmation: Annotated[
        bool,
        about("Report a confirmed track's rows from before its confirmation (written late)"),
    ] = True
    report_coasting_seconds: Annotated[
        float,
        NonNegative,
        about("Report coasting rows up to this long after the last detection", "s"),
    ] = 0.0


class LedgerSettings(Section):
    """What decisions.parquet keeps."""

    level: Annotated[
        Literal["none", "contested", "full"],
        about(
            "'contested' keeps contested components whole and of the others what was chosen; "
            "'full' keeps every candidate"
        ),
    ] = "contested"
    contested_margin: Annotated[
        float,
        NonNegative,
        about(
            "Decisions with a margin below this are contested; 2.3 nats is odds of 10 to 1", "nats"
        ),
    ] = 2.3


class Settings(Section):
    """All settings of a run. `Settings()` is the documented default."""

    time: TimeSettings = TimeSettings()
    sensor: SensorSettings = SensorSettings()
    motion: MotionSettings = MotionSettings()
    camera: CameraSettings = CameraSettings()
    measurement: MeasurementSettings = MeasurementSettings()
    gate: GateSettings = GateSettings()
    cost: CostSettings = CostSettings()
    association: AssociationSettings = AssociationSettings()
    tiers: Annotated[tuple[TierSettings, ...], Meta(min_length=1)] = (TierSettings(),)
    lifecycle: LifecycleSettings = LifecycleSettings()
    output: OutputSettings = OutputSettings()
    ledger: LedgerSettings = LedgerSettings()
    hindsight: HindsightSettings = HindsightSettings()
