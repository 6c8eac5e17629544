"""A track in the frames around a decision, and what became of it."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from tracker.diagnosis.explanation import Moment
from tracker.diagnosis.ledger_reading import Event, RunLedger
from tracker.diagnosis.odds import odds
from tracker.results.tracks import TrackState

EVENTS_TOLD = 4  # that many changes of state are told of what came after


@dataclass(frozen=True, slots=True)
class Life:
    """When a track was born, confirmed and ended; None for what did not happen."""

    born: int | None
    confirmed: int | None
    ended: int | None
    events: tuple[Event, ...]

    def state_after(self, frame: int) -> str | None:
        """Lifecycle state once a frame was done, None before birth."""
        past = [event for event in self.events if event.frame <= frame]
        return past[-1].after if past else None


def read_life(ledger: RunLedger, track: int) -> Life:
    """The life of a track from events.csv; without events the track never was."""
    events = ledger.events(track=track)

    def first(after: TrackState) -> int | None:
        return next((event.frame for event in events if event.after == after.word), None)

    return Life(
        first(TrackState.TENTATIVE),
        first(TrackState.CONFIRMED),
        first(TrackState.ENDED),
        tuple(events),
    )


def afterwards(life: Life, frame: int) -> str:
    """What became of a track after a frame, in words."""
    later = [event for event in life.events if event.frame > frame]
    if not later:
        if life.ended is not None and life.ended <= frame:
            return "it had ended"
        return "its state did not change any more before the run's end"
    told = [f"{event.reason} in frame {event.frame}" for event in later[:EVENTS_TOLD]]
    if len(later) > EVENTS_TOLD:
        told.append("…")
    if life.ended is not None and len(later) > EVENTS_TOLD:
        told.append(f"ended in frame {life.ended} ({later[-1].reason})")
    elif life.ended is not None:
        told[-1] = f"ended in frame {life.ended} ({later[-1].reason})"
    return ", ".join(told)


def moments(ledger: RunLedger, track: int, life: Life, frames: Sequence[int]) -> list[Moment]:
    """What was decided about a track in some frames; those in which it did not live are left out."""
    if not frames:
        return []
    first, last = frames[0], frames[-1]
    rows = ledger.rows(
        "decisions",
        first,
        last,
        columns=(
            "frame", "time", "tier", "decision", "track", "detection", "line", "chosen", "margin",
            "contested",
        ),
        track=track,
    ).to_pylist()  # fmt: skip
    live = ledger.rows(
        "predictions", first, last, columns=("frame", "track", "state"), track=track
    ).to_pylist()
    states = {row["frame"]: row["state"] for row in live}
    decided: dict[int, dict] = {}
    for row in rows:
        if not row["chosen"]:
            continue
        before = decided.get(row["frame"])
        if before is None or before["decision"] == "miss":  # a later tier's word counts
            decided[row["frame"]] = row
    found = []
    for frame in frames:
        events = [event for event in life.events if event.frame == frame]
        if frame not in states and not events:
            continue
        found.append(_moment(frame, states.get(frame), decided.get(frame), events))
    return found


def _moment(frame: int, state: str | None, row: dict | None, events: list[Event]) -> Moment:
    reasons = tuple(event.reason for event in events)
    if row is None:
        decision = "born" if "born" in reasons else ("ended" if state is None else "took no part")
        time = events[0].time if events else None
        return Moment(frame, time, state, decision, None, None, None, "", False, reasons)
    margin = row["margin"]
    return Moment(
        frame=frame,
        time=row["time"],
        state=state,
        decision=row["decision"],
        detection=row["detection"],
        line=row["line"],
        margin=None if margin is None or math.isinf(margin) else margin,
        odds=odds(margin),
        contested=margin is not None and bool(row["contested"]),
        events=reasons,
    )
