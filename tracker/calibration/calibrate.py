"""Measure settings from logs and truth, or from the engine's own confident tracks."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from tracker.calibration import detection as seen
from tracker.calibration import lifecycle, noise
from tracker.calibration.evidence import Evidence
from tracker.calibration.matching import Matched, match
from tracker.errors import UsageError
from tracker.log.model import DetectionLog, Truth
from tracker.settings import Settings

FIT_SHARE = 2.0 / 3.0


@dataclass(frozen=True, slots=True, eq=False)
class Calibration:
    """settings : complete and valid.   evidence : one a measured value, settings first.

    shares : P_D and the share of true detections, in bins.   consistency : NIS of the last third
    of the frames, with noise fitted to the first two thirds.   matched : one a log.
    """

    settings: Settings
    evidence: tuple[Evidence, ...]
    shares: tuple[seen.Share, ...]
    consistency: dict[str, float]
    matched: tuple[Matched, ...]
    distances: Any

    def as_dict(self) -> dict[str, Any]:
        return {
            "evidence": [item.as_dict() for item in self.evidence],
            "shares": [
                {"of": s.of, "from": s.low, "below": s.high, "share": s.value,
                 "interval": s.interval, "observations": s.trials}
                for s in self.shares
            ],
            "consistency": self.consistency,
        }  # fmt: skip


def calibrate(
    logs: DetectionLog | Sequence[DetectionLog],
    truths: Truth | Sequence[Truth],
    *,
    settings: Settings | None = None,
    distance_threshold: float | None = None,
) -> Calibration:
    """Measure settings from logs and their truth.

    logs, truths : as many of each, all of one kind.   settings : what is not measured.
    distance_threshold : points: farthest that a detection is from its object.

    Raises UsageError for kinds or numbers that differ, InputError where nothing matches.
    """
    logs = [logs] if isinstance(logs, DetectionLog) else list(logs)
    truths = [truths] if isinstance(truths, Truth) else list(truths)
    if not logs or len(logs) != len(truths):
        raise UsageError(f"{len(logs)} logs but {len(truths)} truths; give one each, in order")
    if len({log.kind for log in logs}) > 1:
        raise UsageError("the logs are of different kinds; calibrate boxes and points apart")
    start = settings or Settings()
    found = [match(a, b, distance_threshold) for a, b in zip(logs, truths, strict=True)]
    share = seen.detection_probability(found)
    density = seen.new_density(found, distance_threshold)
    chains = [noise.chains_of(item, start) for item in found]
    early = [item.until(FIT_SHARE) for item in chains]
    late = [item.until(FIT_SHARE, after=True) for item in chains]
    held_out = noise.consistency(late, noise.fit_noise(early, start)[0])
    tuned, sigmas = noise.fit_noise(chains, start)
    evidence = [share, density]
    tuned = _adopt(tuned, evidence)
    evidence += sigmas
    later = [lifecycle.coasting(found), lifecycle.birth_score(found)]
    later += lifecycle.confirmation(found, chains, tuned, share.value)
    tuned = _adopt(tuned, later)
    evidence += later
    evidence += [seen.clutter_rate(found), *noise.measurement_error(found)]
    return Calibration(
        tuned, tuple(evidence), tuple(seen.detection_shares(found)), held_out, tuple(found),
        noise.distances(late, tuned),
    )  # fmt: skip


def _adopt(settings: Settings, evidence: Sequence[Evidence]) -> Settings:
    return noise.set_values(
        settings, {e.setting: e.value for e in evidence if not e.kept and "." in e.setting}
    )
