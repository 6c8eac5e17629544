"""Settings of what is done once the log is over."""

from __future__ import annotations

from typing import Annotated, Literal

from tracker.settings.fields import NonNegative, Positive, Probability, Section, about


class HindsightSettings(Section):
    """`margent associate --offline`: what can be known once the log is over."""

    common_motion: Annotated[
        Literal["measured", "none"],
        about(
            "'measured' takes what tracks have in common from scan to scan for the sensor's own "
            "motion and compares positions without it; 'none' takes positions as they are"
        ),
    ] = "measured"
    noise: Annotated[
        Literal["measured", "settings"],
        about(
            "Process noise: 'measured' is what predicts the log's own tracks best over up to 2 s; "
            "'settings' is that of [motion]"
        ),
    ] = "measured"
    cut_seconds: Annotated[
        float,
        NonNegative,
        about("Where a track was unseen for longer than this, who it is is decided anew", "s"),
    ] = 0.5
    cut_margin: Annotated[
        float,
        NonNegative,
        about(
            "And where a decision of the engine had a smaller margin than this (of several within "
            "a second the closest call); 0 lets them be, 1 nat is odds of 2.7 to 1",
            "nats",
        ),
    ] = 1.0
    link_seconds: Annotated[
        float, NonNegative, about("Longest gap that is linked; 0 links nothing", "s")
    ] = 4.0
    gate_probability: Annotated[
        float, Probability, about("Chance that the true continuation falls inside the d² gate")
    ] = 0.9999
    interruption_probability: Annotated[
        float, Probability, about("Chance that an object whose track ends is still there, unseen")
    ] = 0.5
    hidden_seconds: Annotated[
        float, Positive, about("Mean time that such an object stays unseen", "s")
    ] = 1.0
    link_margin: Annotated[
        float,
        NonNegative,
        about(
            "A link between two tracks with a smaller margin is not made; 2.3 nats is odds of 10 "
            "to 1. What was one track is one again if nothing is better",
            "nats",
        ),
    ] = 2.3
    fill_seconds: Annotated[
        float, NonNegative, about("Longest gap whose rows are reported; 0 reports none", "s")
    ] = 4.0
    fill_spread: Annotated[
        float,
        Positive,
        about(
            "Rows in a gap are reported where the smoothed position is known to within this",
            "standard deviations of a detection",
        ),
    ] = 6.0
