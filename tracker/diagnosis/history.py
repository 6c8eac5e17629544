"""A track in the frames around a decision, and what became of it."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from tracker.diagnosis.explanation import Moment
from tracker.diagnosis.ledger_reading import Event, RunLedger
from tracker.diagnosis.words import odds
from tracker.results.tracks import TrackState

EVENTS_TOLD = 4  # that many changes of state are told of what came after

DECISION_COLUMNS = ("frame", "time", "track", "decision", "detection", "line", "chosen", "margin")


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
        over = life.ended is not None and life.ended <= frame
        return "it was over" if over else "its state did not change before the run's end"
    told = [_phrase(event) for event in later[:EVENTS_TOLD]]
    if len(later) > EVENTS_TOLD:
        told.append("…")
        if later[-1].after == TrackState.ENDED.word:
            told.append(_phrase(later[-1]))
    return ", ".join(told)


def _phrase(event: Event) -> str:
    if event.after == TrackState.ENDED.word:
        return f"ended in frame {event.frame} ({event.reason})"
    return f"{event.reason} in frame {event.frame}"


def moments(ledger: RunLedger, track: int, life: Life, frames: Sequence[int]) -> list[Moment]:
    """What was decided about a track in some frames, those left out in which it did not live."""
    if not frames:
        return []
    first, last = frames[0], frames[-1]
    decided: dict[int, dict] = {}
    for row in ledger.rows(
        "decisions", first, last, columns=DECISION_COLUMNS, track=track
    ).to_pylist():
        known = decided.get(row["frame"])
        if row["chosen"] and (known is None or known["decision"] == "miss"):
            decided[row["frame"]] = row  # a later tier may pair what an earlier one missed
    states = _by_frame(ledger, "predictions", ("frame", "state"), first, last, track)
    columns = ("frame", "time", "line", "confidence")
    shown = _by_frame(ledger, ledger.own_tracks, columns, first, last, track)
    limit = ledger.settings.ledger.contested_margin
    found = []
    for frame in frames:
        events = [event for event in life.events if event.frame == frame]
        if frame in states or events:
            found.append(
                _moment(
                    frame,
                    states.get(frame, {}).get("state"),
                    decided.get(frame),
                    shown.get(frame, {}),
                    events,
                    limit,
                )
            )
    return found


def _by_frame(
    ledger: RunLedger, name: str, columns: tuple[str, ...], first: int, last: int, track: int
) -> dict[int, dict]:
    rows = ledger.rows(name, first, last, columns=columns, track=track).to_pylist()
    return {row["frame"]: row for row in rows}


def _moment(
    frame: int, state: str | None, row: dict | None, shown: dict, events: list[Event], limit: float
) -> Moment:
    reasons = tuple(event.reason for event in events)
    if row is None:
        decision = "took no part"
        if state is None:
            decision = "born" if "born" in reasons else "ended"
        times = [event.time for event in events] + [shown.get("time")]
        row = {"decision": decision, "time": times[0], "line": shown.get("line")}
    margin: float | None = row.get("margin")
    return Moment(
        frame=frame,
        time=row["time"],
        state=state,
        decision=row["decision"],
        detection=row.get("detection"),
        line=row["line"],
        margin=None if margin is None or math.isinf(margin) else margin,
        odds="" if margin is None else odds(margin),
        contested=margin is not None and margin < limit,
        confidence=shown.get("confidence"),
        events=reasons,
    )
