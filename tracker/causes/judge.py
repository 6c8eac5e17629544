"""Trace one error to the stage that caused it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.special import gammainc

from tracker.causes.model import Cause
from tracker.causes.pairing import Objects
from tracker.causes.record import RunRecord

# An object that moves further than this in one frame was probably annotated wrongly; common
# practice, no source.
JUMP_SIZES = 2.0


@dataclass(frozen=True, slots=True)
class Verdict:
    """A cause with its number and where it lies."""

    cause: Cause
    frame: int
    measure: float | None = None
    unit: str = ""
    words: str = ""


class Judge:
    """Looks up why an object was not tracked as before."""

    def __init__(self, record: RunRecord, objects: Objects) -> None:
        self._record = record
        self._objects = objects

    def lost(self, track: int, first: int, last: int) -> Verdict:
        """Why `track`, on the object at row `first`, is not on it at row `last` (rows of Objects).

        The frames between are gone through in order; the first in which the object was detected
        and the living track did not get it decides.
        """
        record, objects = self._record, self._objects
        jump = self._jump(first, last)
        if jump is not None:
            return jump
        end = record.ended.get(track)
        detected = 0
        for row in range(first + 1, last + 1):
            frame, detection = int(objects.frame[row]), int(objects.detection[row])
            if record.expected(frame, track) is None:
                break  # not alive any more
            if detection < 0 or int(objects.track[row]) == track:
                continue
            detected += 1
            verdict = self._not_given(track, frame, detection)
            if verdict is not None:
                return verdict
        if end is not None and end <= int(objects.frame[last]):
            gap = float(objects.time[last] - objects.time[first])
            limit = record.settings.lifecycle.coast_seconds
            return Verdict(
                Cause.ENDED,
                end,
                gap,
                "s unseen",
                f"track {track} had ended: unseen for {gap:.2f} s, coasting limit {limit:g} s",
            )
        if not detected:
            return Verdict(Cause.NO_DETECTION, int(objects.frame[last]), words="not detected")
        return Verdict(
            Cause.POSITION,
            int(objects.frame[last]),
            words=f"track {track} had the detection, but its reported place is off the object",
        )

    def untracked(self, row: int) -> Verdict:
        """Why an annotated row without an earlier track has no track."""
        record, objects = self._record, self._objects
        frame, detection = int(objects.frame[row]), int(objects.detection[row])
        if detection < 0:
            return Verdict(Cause.NO_DETECTION, frame, words="not detected")
        at = record.row_of_detection[frame, detection]
        taker = record.taken_by.get((frame, detection))
        if taker is None:
            if record.too_weak_for_birth(at) or record.outside_all_tiers(at):
                score = float(record.score[at])
                return Verdict(Cause.SCORE, frame, score, "score", f"detection scored {score:.2f}")
            taker = record.born_at.get((frame, detection))
        if taker is None:
            return Verdict(Cause.CONFIRMATION, frame, words="detected, no track began")
        if taker in record.confirmed:
            return Verdict(
                Cause.POSITION, frame, words=f"track {taker} took it, but is paired elsewhere"
            )
        return self._never_confirmed(taker, row)

    def _never_confirmed(self, track: int, row: int) -> Verdict:
        """A tentative track that was dropped: did it lose the object's detections, or lack them?"""
        record, objects = self._record, self._objects
        after = row + 1
        while after < len(objects) and objects.object[after] == objects.object[row]:
            frame, detection = int(objects.frame[after]), int(objects.detection[after])
            if record.expected(frame, track) is None:
                break
            if detection >= 0:
                verdict = self._not_given(track, frame, detection)
                if verdict is not None:
                    return verdict
            after += 1
        life = record.settings.lifecycle
        return Verdict(
            Cause.CONFIRMATION,
            int(objects.frame[row]),
            words=f"track {track} did not reach {life.confirm_hits} detections in "
            f"{life.confirm_window} frames",
        )

    def _not_given(self, track: int, frame: int, detection: int) -> Verdict | None:
        """Why a living track did not get a detection; None if it did."""
        record = self._record
        if record.given.get((frame, track)) == detection:
            return None
        pair = record.candidate(frame, track, detection)
        if pair is None:
            return None
        if not pair.inside:
            needed = float(gammainc(0.5 * record.rule.dimension, 0.5 * pair.distance))
            if pair.distance <= record.rule.threshold:
                words = f"IoU {pair.overlap:.2f} with track {track} is below the floor"
                return Verdict(Cause.GATE, frame, pair.overlap, "IoU", words)
            return Verdict(
                Cause.GATE,
                frame,
                needed,
                "P_G needed",
                f"d² {pair.distance:.1f} from track {track}, gate {record.rule.threshold:.1f}; "
                f"P_G {needed:.7g} would have admitted it",
            )
        winner = record.taken_by.get((frame, detection))
        whom = f"track {winner}" if winner is not None else "nobody (new)"
        margin = pair.force_cost
        if np.isnan(margin) and winner is not None:
            margin = record.margin.get((frame, winner), np.nan)
        nats = None if not np.isfinite(margin) else float(margin)
        far = "" if nats is None else f", {nats:.2f} nats away"
        return Verdict(Cause.CONTEST, frame, nats, "nats", f"track {track} lost it to {whom}{far}")

    def _jump(self, first: int, last: int) -> Verdict | None:
        """A step of the annotated object that no object makes."""
        objects = self._objects
        size = objects.z[:, 2:4].max(axis=1) if objects.z.shape[1] == 4 else None
        if size is None:
            return None
        for row in range(first + 1, last + 1):
            step = np.abs(objects.z[row, :2] - objects.z[row - 1, :2]).max()
            frames = objects.frame[row] - objects.frame[row - 1]
            if frames == 1 and step > JUMP_SIZES * size[row - 1]:
                frame = int(objects.frame[row])
                return Verdict(
                    Cause.TRUTH,
                    frame,
                    float(step / size[row - 1]),
                    "sizes jumped",
                    "the annotated object jumps",
                )
        return None
