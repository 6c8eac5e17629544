"""Wald's sequential probability ratio test, in the numbers that the kernel takes."""

from __future__ import annotations

import math
from dataclasses import dataclass

from tracker.settings.schema import LifecycleSettings


@dataclass(frozen=True, slots=True)
class EvidenceTest:
    """Thresholds on the log-odds that a track is an object, in nats.

    start : log-odds at birth.   confirm_at : ln ((1 − β) / α), drop_at : ln (β / (1 − α)), for a
    false-confirm probability α and a false-drop probability β (Wald 1947, ch. 3; Blackman and
    Popoli 1999, ch. 6). Both are for even odds at the start; other odds move them alike.
    """

    start: float
    confirm_at: float
    drop_at: float


def evidence_test(settings: LifecycleSettings) -> EvidenceTest:
    """The test that the settings ask for."""
    alpha, beta = settings.false_confirm_probability, settings.false_drop_probability
    return EvidenceTest(
        start=math.log(settings.real_share / (1.0 - settings.real_share)),
        confirm_at=math.log((1.0 - beta) / alpha),
        drop_at=math.log(beta / (1.0 - alpha)),
    )
