"""Measure settings from logs and truth, or from the engine's own confident tracks."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from tracker.calibration import detection as seen
from tracker.calibration import lifecycle, noise, selftaught
from tracker.calibration.coverage import hold_gate
from tracker.calibration.evidence import Evidence
from tracker.calibration.matching import Matched, match
from tracker.calibration.noise import Chains
from tracker.errors import UsageError
from tracker.log.model import DetectionLog, Floats, Truth
from tracker.settings import Settings

FIT_SHARE = 2.0 / 3.0


@dataclass(frozen=True, slots=True, eq=False)
class Calibration:
    """settings : complete and valid.   evidence : one a measured value, settings first.

    shares : P_D and the share of true detections, in bins.   consistency : NIS of the last third
    of the frames, with noise fitted to the first two thirds.   matched : one a log, none without
    truth.   distances : d² of all innovations under `settings`.   dimension : of one measurement.
    """

    source: str
    settings: Settings
    evidence: tuple[Evidence, ...]
    shares: tuple[seen.Share, ...]
    consistency: dict[str, float]
    matched: tuple[Matched, ...]
    dimension: int
    distances: Floats

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
    truths: Truth | Sequence[Truth] | None = None,
    *,
    settings: Settings | None = None,
    distance_threshold: float | None = None,
) -> Calibration:
    """Measure settings from logs and their truth, or without truth from confident tracks.

    logs, truths : as many of each, all of one kind; no truths: the engine's own tracks are
    learned from, and what needs truth keeps its value.   settings : what is not measured.
    distance_threshold : points: farthest that a detection is from its object.

    Raises UsageError for kinds or numbers that differ, InputError where nothing matches.
    """
    logs = [logs] if isinstance(logs, DetectionLog) else list(logs)
    start = settings or Settings()
    if not logs:
        raise UsageError("there is no log to calibrate from")
    if len({log.kind for log in logs}) > 1:
        raise UsageError("the logs are of different kinds; calibrate boxes and points apart")
    if truths is None:
        return _self_taught(logs, start)
    truths = [truths] if isinstance(truths, Truth) else list(truths)
    if len(logs) != len(truths):
        raise UsageError(f"{len(logs)} logs but {len(truths)} truths; give one each, in order")
    found = [match(a, b, distance_threshold) for a, b in zip(logs, truths, strict=True)]
    share = seen.detection_probability(found)
    density = seen.new_density(found, distance_threshold)
    chains = [noise.chains_of(item, start) for item in found]
    held_out = _held_out(chains, start)
    tuned, sigmas = hold_gate(chains, *noise.fit_noise(chains, start))
    evidence = [share, density, *sigmas]
    tuned = _adopt(tuned, evidence)
    later = [lifecycle.coasting(found), lifecycle.birth_score(found)]
    later += lifecycle.confirmation(found, chains, tuned, share.value)
    tuned = _adopt(tuned, later)
    evidence += [*later, seen.clutter_rate(found), *noise.measurement_error(found)]
    return Calibration(
        f"Calibrated from {_names(logs)} and truth",
        tuned, tuple(evidence), tuple(seen.detection_shares(found)), held_out, tuple(found),
        logs[0].kind.dimension,
        noise.distances(chains, tuned),
    )  # fmt: skip


def _self_taught(logs: list[DetectionLog], start: Settings) -> Calibration:
    pairs = [selftaught.own_chains(log, start) for log in logs]
    chains = [item for item, _ in pairs]
    share = selftaught.detected_share([item for _, item in pairs])
    factor = selftaught.cut_off(chains, start)
    sigmas = selftaught.widened(noise.fit_noise(chains, start)[1], factor)
    evidence = [share, *sigmas]
    tuned = _adopt(start, evidence)
    return Calibration(
        f"Calibrated from {_names(logs)} without truth, from the engine's own confident tracks; "
        "innovations outside their gate were never seen, and the noise is corrected for that",
        tuned, tuple(evidence), (), _held_out(chains, start), (), logs[0].kind.dimension,
        noise.distances(chains, tuned),
    )  # fmt: skip


def _held_out(chains: list[Chains], start: Settings) -> dict[str, float]:
    """Consistency in the last third of the frames of noise fitted to those before."""
    fitted, _ = noise.fit_noise([item.until(FIT_SHARE) for item in chains], start)
    return noise.consistency([item.until(FIT_SHARE, after=True) for item in chains], fitted)


def _names(logs: list[DetectionLog]) -> str:
    return ", ".join(log.name for log in logs)


def _adopt(settings: Settings, evidence: Sequence[Evidence]) -> Settings:
    return noise.set_values(
        settings, {e.setting: e.value for e in evidence if not e.kept and "." in e.setting}
    )
