"""Explain what a run decided in a frame, from its ledger."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from pathlib import Path

from tracker.diagnosis.contest import GEOMETRIC_TERMS
from tracker.diagnosis.explanation import RECOMPUTED, Decision, Explanation, Moment, WhyNot
from tracker.diagnosis.frame_record import FrameRecord, some_of
from tracker.diagnosis.history import moments
from tracker.diagnosis.inquiry import Inquiry
from tracker.diagnosis.ledger_reading import RunLedger
from tracker.diagnosis.two_names import engine_track
from tracker.diagnosis.views import detection_views, track_views
from tracker.diagnosis.why_not import track_span, why_not
from tracker.errors import InputError, UsageError

FRAMES_BEFORE = 6
FRAMES_AFTER = 6
MOST_DECISIONS = 20  # of a whole frame are told, the closest ones
CLOSEST = 3  # that many where none is contested


def explain(
    run: str | Path,
    frame: int,
    *,
    track: int | None = None,
    detection: int | None = None,
    line: int | None = None,
    others: Sequence[int] = (),
    other_lines: Sequence[int] = (),
) -> Explanation:
    """Explain a frame's decision about a track or a detection, or all its contested decisions.

    Parameters
    ----------
    run : run folder with a ledger.   frame : frame number.   track : id.   detection : number in
    the frame, from 0; or `line`, its line in the log.
    others : "why not these": detections where a track is asked about, else tracks.
    other_lines : the same for detections given by their line.

    Nothing is decided anew: chosen pairs, costs, prices and margins are the ledger's. What an
    alternative would have changed is measured on the recorded component.

    Raises InputError for a run without ledger, and for a frame, track, detection or line that is
    not in it, naming what is; UsageError if more than one subject is named or `others` has none.
    """
    if sum(given is not None for given in (track, detection, line)) > 1:
        raise UsageError(
            "name a track, a detection or a line, only one of them; to ask about a pair, name one "
            "and give the other as 'why not'"
        )
    if (others or other_lines) and track is None and detection is None and line is None:
        raise UsageError("'why not' needs a track, or a detection, to be asked about")
    if other_lines and track is None:
        raise UsageError("for a detection, 'why not' names tracks by their id, not lines")
    inquiry = Inquiry(RunLedger(run), frame)
    record = inquiry.record
    if line is not None:
        detection = _detection_at(inquiry, line)
    if detection is not None:
        _check_detection(inquiry, detection)
    notes: list[str] = []
    if track is not None:
        live = record.row_of(track) is not None
        track, notes = engine_track(inquiry.ledger, frame, track, live)
        decisions = _about_track(inquiry, track, notes)
        wanted = [*others, *(_detection_at(inquiry, number) for number in other_lines)]
        for number in wanted:
            _check_detection(inquiry, number)
        answers = [why_not(inquiry, track, number) for number in wanted]
    elif detection is not None:
        decisions = _about_detection(inquiry, detection, notes)
        for number in others:
            track_span(inquiry, number)
        answers = [why_not(inquiry, number, detection) for number in others]
    else:
        decisions, answers = _about_frame(inquiry), []
    subject = track if track is not None else _track_of(record, detection)
    tracks, detections = _named(decisions, answers, subject, detection, record)
    contested = len(inquiry.closest_rows(inquiry.limit))
    whole_frame = track is None and detection is None
    return Explanation(
        run=inquiry.ledger.name,
        folder=str(run),
        kind=str(inquiry.ledger.kind),
        ledger_level=inquiry.ledger.level,
        contested_margin=inquiry.limit,
        frame=frame,
        time=record.time,
        track=track,
        detection=detection,
        decided=int(record.decisions.chosen.sum()),
        contested=contested,
        left_out=max(0, contested - len(decisions)) if whole_frame else 0,
        decisions=tuple(decisions),
        why_not=tuple(answers),
        tracks=track_views(inquiry, tracks),
        detections=detection_views(inquiry, detections),
        history=_history(inquiry, subject),
        notes=(*notes, *_notes(inquiry, decisions, answers)),
    )


def _about_track(inquiry: Inquiry, track: int, notes: list[str]) -> list[Decision]:
    record = inquiry.record
    span = track_span(inquiry, track)
    rows = inquiry.rows_of(track=track).tolist()
    if record.row_of(track) is not None:
        if not rows:
            notes.append(
                f"Track {track} took part in no tier: none takes tracks in the state it was in."
            )
        return [inquiry.decision(r, by_detection=False) for r in rows]
    life = inquiry.life(track)
    if life.born == record.number:
        births = {born: detection for detection, born in record.born.items()}
        if track not in births:
            return []
        return _about_detection(inquiry, births[track], notes)
    if life.ended == record.number:
        notes.append(
            f"Track {track} ended in this frame ({life.events[-1].reason}), before detections were "
            "looked at, so nothing was decided about it."
        )
        return []
    raise InputError(
        f"track {track} is not live in frame {record.number}: {span}",
        path=inquiry.ledger.folder,
        remedy=f"Live in frame {record.number}: {some_of(record.track.tolist())}.",
    )


def _about_detection(inquiry: Inquiry, detection: int, notes: list[str]) -> list[Decision]:
    rows = inquiry.rows_of(detection=detection).tolist()
    if not rows:
        notes.append(
            f"Detection {detection} took part in no tier: its score "
            f"{inquiry.record.score[detection]:g} is outside the range of each."
        )
    return [inquiry.decision(r, by_detection=True) for r in rows]


def _about_frame(inquiry: Inquiry) -> list[Decision]:
    rows = inquiry.closest_rows(inquiry.limit)[:MOST_DECISIONS]
    if not len(rows):
        rows = inquiry.closest_rows()[:CLOSEST]
    alone = inquiry.record.decisions.track < 0
    return [inquiry.decision(r, by_detection=bool(alone[r]), with_outside=False) for r in rows]


def _check_detection(inquiry: Inquiry, detection: int) -> None:
    count = len(inquiry.record.z)
    if not 0 <= detection < count:
        raise InputError(
            f"frame {inquiry.record.number} has no detection {detection}; "
            + (f"they are numbered from 0 to {count - 1}" if count else "it has none at all"),
            path=inquiry.ledger.folder,
            remedy="--line takes the line in the log instead." if count else "",
        )


def _detection_at(inquiry: Inquiry, line: int) -> int:
    """The detection of the frame from a source line."""
    record = inquiry.record
    for j, own in enumerate(record.line.tolist()):
        if own == line:
            return j
    why = inquiry.ledger.rejection_of_line(line)
    elsewhere = inquiry.ledger.frames_of_line(line)
    if elsewhere:
        remedy = f"That line is in frame {some_of(elsewhere)}."
    elif why is not None:
        remedy = f"That line was rejected: {why}."
    else:
        remedy = f"Its lines are {some_of(record.line.tolist())}."
        floor = inquiry.ledger.settings.sensor.score_floor
        if floor is not None:
            remedy += f" Detections scored below {floor:g} (sensor.score_floor) were not used."
    raise InputError(
        f"frame {record.number} has no detection from line {line}",
        path=inquiry.ledger.folder,
        remedy=remedy,
    )


def _track_of(record: FrameRecord, detection: int | None) -> int | None:
    """The track that got a detection or was started by it."""
    if detection is None:
        return None
    given = record.given_to(detection)
    return record.born.get(detection) if given is None else given


def _history(inquiry: Inquiry, track: int | None) -> tuple[Moment, ...]:
    if track is None:
        return ()
    number = inquiry.record.number
    earlier, later = inquiry.ledger.frames_around(number, FRAMES_BEFORE, FRAMES_AFTER)
    frames = [*earlier, number, *later]
    return tuple(moments(inquiry.ledger, track, inquiry.life(track), frames))


def _named(
    decisions: Iterable[Decision],
    answers: Iterable[WhyNot],
    track: int | None,
    detection: int | None,
    record: FrameRecord,
) -> tuple[set[int], set[int]]:
    """All tracks and detections that the explanation speaks of, and what those got."""
    tracks, detections = {track}, {detection}
    for decision in decisions:
        tracks.add(decision.track)
        detections.add(decision.detection)
        for option in decision.alternatives:
            tracks |= {option.track, option.held_by, *(item.track for item in option.changes)}
            detections |= {option.detection, option.holds}
            detections |= {
                number for item in option.changes for number in (item.before, item.after)
            }
        for item in decision.outside:
            tracks.add(item.track)
            detections.add(item.detection)
    for answer in answers:
        tracks.add(answer.track)
        detections.add(answer.detection)
        if answer.alternative is not None:
            tracks |= {item.track for item in answer.alternative.changes}
    named = {number for number in tracks if number is not None}
    detections |= {record.given(number) for number in named}
    return named, {number for number in detections if number is not None}


def _notes(inquiry: Inquiry, decisions: list[Decision], answers: list[WhyNot]) -> list[str]:
    settings = inquiry.ledger.settings
    notes = []
    options = [option for decision in decisions for option in decision.alternatives]
    options += [answer.alternative for answer in answers if answer.alternative is not None]
    if any(option.source == RECOMPUTED for option in options):
        notes.append(
            "The ledger (level 'contested') keeps of components without a contested decision only "
            "what was chosen and its margin. Their other candidates, marked *, were worked out "
            "from predictions.parquet and detections.parquet by the run's own rule."
        )
    if any(decision.component_tracks and not decision.complete for decision in decisions):
        notes.append(
            "Costs of candidates marked * cannot be worked out: the run's cost has terms other "
            f"than {', '.join(GEOMETRIC_TERMS)}, or its settings.toml was changed. Run 'margent "
            "associate' again with --set ledger.level=full to have them recorded."
        )
    if settings.association.mode == "joint-probabilistic":
        notes.append(
            "This run corrected each track by all its candidates, weighted by their probability "
            "(joint-probabilistic mode). The pairs here are those of the best assignment, which "
            "decided births and lifecycle."
        )
    if len(settings.tiers) > 1:
        notes.append("Margins and force costs hold within a tier; later tiers are not weighed in.")
    if not set(inquiry.rules.tiers[0].terms) & {"likelihood"}:
        notes.append(
            "Odds are as good as the costs: those of "
            f"{' + '.join(inquiry.rules.tiers[0].terms)} are a documented scale, not measured "
            "probabilities."
        )
    return notes
