"""What went wrong, and why: the words and their meaning."""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum


class Error(StrEnum):
    """What went wrong."""

    SWITCH = "switch"  # an object came back under another identity
    BREAK = "break"  # an object was lost between two times it was tracked
    MISS = "miss"  # an object was never tracked, or not any more
    LATE = "late confirmation"  # an object was missed before it was first tracked
    FALSE = "false track"  # reported rows without an object


class Cause(StrEnum):
    """Why, in the order in which it is looked for."""

    TRUTH = "truth suspicious"
    NO_DETECTION = "no detection"
    SCORE = "below the birth or tier score"
    GATE = "outside the gate"
    CONTEST = "lost the contest"
    ENDED = "track had ended"
    CONFIRMATION = "not yet confirmed"
    POSITION = "position off"
    DUPLICATE = "duplicate birth"
    CLUTTER = "clutter confirmed"
    COASTING = "coasting drift"


# The setting that each cause points to.
SETTING = {
    Cause.TRUTH: "",
    Cause.NO_DETECTION: "sensor.detection_probability (the detector)",
    Cause.SCORE: "lifecycle.birth_score, tiers",
    Cause.GATE: "gate.probability, measurement and motion noise",
    Cause.CONTEST: "cost",
    Cause.ENDED: "lifecycle.coast_seconds",
    Cause.CONFIRMATION: "lifecycle.confirm_hits, confirm_window",
    Cause.POSITION: "measurement noise, output.position",
    Cause.DUPLICATE: "lifecycle.birth_score, cost",
    Cause.CLUTTER: "lifecycle.confirm_hits, birth_score",
    Cause.COASTING: "output.report_coasting_seconds",
}


@dataclass(frozen=True, slots=True)
class Finding:
    """One error and its cause.

    frame, last_frame : where it shows; rows : how many annotated or reported rows it spoils.
    object : its name, '' for false tracks.   track : the track concerned, None if there is none;
    before : at a switch the track that had the object before.
    measure : the number behind the cause, `unit` says of what: d² and the P_G that would have
    admitted the pair, nats of the lost contest, seconds of the gap.
    cause_frame : the frame in which the cause lies.
    """

    error: Error
    cause: Cause
    frame: int
    last_frame: int
    time: float
    rows: int
    object: str
    track: int | None
    before: int | None
    cause_frame: int
    measure: float | None
    unit: str
    words: str
