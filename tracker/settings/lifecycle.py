"""Settings of the lifecycle: birth, confirmation, coasting, end."""

from __future__ import annotations

from typing import Annotated, Literal

from msgspec import Meta

from tracker.settings.fields import NonNegative, Probability, Section, about


class LifecycleSettings(Section):
    """Birth, confirmation, coasting, end."""

    birth_score: Annotated[
        float | None,
        about("An unpaired detection scored at or above this starts a track", "score"),
    ] = None
    rule: Annotated[
        Literal["hits", "evidence"],
        about(
            "What confirms a track: 'hits' counts detections, M of N; 'evidence' is Wald's "
            "sequential test of the track's log-likelihood ratio, for the 'likelihood' cost, and "
            "ends confirmed tracks too once the evidence is used up",
            "",
            "Sittler 1964; Wald 1947; Blackman and Popoli 1999, ch. 6",
        ),
    ] = "hits"
    confirm_hits: Annotated[
        int, Meta(ge=1, le=64), about("M: detections that confirm a track", "detections")
    ] = 2
    confirm_window: Annotated[
        int, Meta(ge=1, le=64), about("N: frames since birth within which they count", "frames")
    ] = 3
    false_confirm_probability: Annotated[
        float, Probability, about("Evidence: chance that a track of clutter is confirmed")
    ] = 0.01
    false_drop_probability: Annotated[
        float, Probability, about("Evidence: chance that a track of an object is dropped before")
    ] = 0.01
    real_share: Annotated[
        float, Probability, about("Evidence: share of births that are real, before any is seen")
    ] = 0.5
    undecided_frames: Annotated[
        int,
        Meta(ge=2, le=1000),
        about("Evidence: a track that is not confirmed within so many frames ends", "frames"),
    ] = 30
    coast_seconds: Annotated[
        float,
        NonNegative,
        about("A confirmed track ends once its last detection is older than this", "s"),
    ] = 2.0
    exit_share: Annotated[
        Annotated[float, Meta(gt=0.0, le=1.0)] | None,
        about(
            "A coasting track ends at once where this share of its box (or its point) is outside "
            "the image or inside an exit zone of sequence.toml; none lets it coast"
        ),
    ] = 0.9
