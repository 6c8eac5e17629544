"""An explanation as text for a person."""

from __future__ import annotations

import math
import textwrap
from collections.abc import Iterable, Sequence

from tracker.diagnosis.explanation import (
    RECOMPUTED,
    Alternative,
    Decision,
    Explanation,
    Moment,
    TrackView,
    WhyNot,
)
from tracker.diagnosis.words import changes_words, detection_name, gate_words, nats, odds

EMPTY = "–"
LINE_LENGTH = 100
SHOWN_OPTIONS = 12  # of a decision, the best ones
SHOWN_OTHERS = 12  # other tracks


def tell(told: Explanation) -> str:
    """The whole story, paragraphs parted by empty lines; ends with a line feed."""
    parts = [title(told)]
    if told.track is None and told.detection is None:
        parts += briefs(told, told.decisions)
        parts.append(_hint(told))
    else:
        for item in told.decisions:
            parts += [headline(told, item), _options(item), _outside(item)]
        parts.append(_birth(told))
        parts += [_why_not(told, item) for item in told.why_not]
        parts += [_track(told), _history(told), _others(told)]
    parts += [_wrapped(f"Note: {note}", hang="") for note in told.notes]
    parts.append(_wrapped(told.caution, hang=""))
    return "\n\n".join(part for part in parts if part) + "\n"


def title(told: Explanation) -> str:
    """Run, frame, and what was asked about."""
    time = "" if told.time is None else f" ({told.time:.3f} s)"
    title = f"{told.run}, frame {told.frame}{time}"
    if told.track is not None:
        return f"{title}: track {told.track}"
    if told.detection is not None:
        return f"{title}: {detection_name(told.detection, told.line_of(told.detection))}"
    limit = f"margin below {nats(told.contested_margin)} nats, odds {odds(told.contested_margin)}"
    if told.contested:
        return f"{title}: {told.contested} of {told.decided} decisions are contested ({limit})"
    rest = "the closest:" if told.decisions else "nothing else was possible in any."
    return f"{title}: none of {told.decided} decisions is contested ({limit}); {rest}"


def _what(told: Explanation, item: Decision) -> str:
    name = detection_name(item.detection, item.line)
    if item.decision == "pair":
        return f"Track {item.track} was given {name}"
    if item.decision == "miss":
        return f"Track {item.track} was missed: it was given no detection"
    return f"{name[0].upper()}{name[1:]} was given to no track"


def headline(told: Explanation, item: Decision) -> str:
    """What was decided, how much worse the next best answer is, and what it would have changed."""
    several = any(other.tier != item.tier for other in told.decisions)
    said = [_what(told, item) + (f" in tier '{item.tier_name}'." if several else ".")]
    if item.margin is None:
        said.append("Nothing else was possible: there was no candidate inside the gate.")
    elif item.margin < 0.005:
        said.append("Another answer is exactly as good: a tie, and contested.")
    else:
        close = ", contested" if item.contested else ""
        said.append(
            f"The best answer without that is {nats(item.margin)} nats worse "
            f"(odds {item.odds}{close})."
        )
    best = item.runner_up
    if best is not None and best.changes:
        said.append(f"In it {changes_words(best.changes, told.line_of)}.")
    return "\n".join(map(_wrapped, said))


def briefs(told: Explanation, decisions: Iterable[Decision]) -> list[str]:
    """Decisions of a whole frame, some lines each; those that one exchange would undo together."""
    groups: dict[object, list[Decision]] = {}
    for item in decisions:
        best = item.runner_up
        key = (item.decision, item.track, item.detection) if best is None else best.changes
        groups.setdefault(key, []).append(item)
    return [_brief(told, group) for group in groups.values()]


def _brief(told: Explanation, group: Sequence[Decision]) -> str:
    first = group[0]
    margin = "a tie" if first.margin is not None and first.margin < 0.005 else nats(first.margin)
    head = f"{margin} ({first.odds})  "
    lines = [f"{_what(told, item)}." for item in group]
    if first.runner_up is not None:
        changes = changes_words(first.runner_up.changes, told.line_of)
        lines.append(f"Runner-up: {changes}.")
    width = max(LINE_LENGTH - len(head), 40)
    whole = "\n".join(textwrap.fill(line, width, subsequent_indent="    ") for line in lines)
    return head + textwrap.indent(whole, " " * len(head)).lstrip()


def _hint(told: Explanation) -> str:
    said = f"{told.left_out} more are contested. " if told.left_out else ""
    return said + "Name one with --track, --detection or --line for all its alternatives."


def _options(item: Decision) -> str:
    """Table of what could have been decided, if there was a choice."""
    if len(item.alternatives) == 1:
        return ""
    terms = sorted({name for option in item.alternatives for name in option.terms})
    boxes = any(o.gate is not None and o.gate.overlap is not None for o in item.alternatives)
    head = ["", "cost", *(terms if len(terms) > 1 else []), "d²", *(["IoU"] if boxes else [])]
    rows = [[*head, "worse by", "odds", ""]]
    by_track = _seen_from_track(item)
    for option in item.alternatives[:SHOWN_OPTIONS]:
        gate = option.gate
        row = [_option_name(option, by_track), nats(option.cost)]
        if len(terms) > 1:
            row += [nats(option.terms[t]) if t in option.terms else EMPTY for t in terms]
        row.append(EMPTY if gate is None else f"{gate.distance:.3g}")
        if boxes:
            row.append(EMPTY if gate is None or gate.overlap is None else f"{gate.overlap:.2f}")
        row += ["" if option.chosen else nats(option.force_cost), option.odds]
        rows.append([*row, _role(option, by_track)])
    scope = f"{_count(item.component_tracks, 'track')} and " + _count(
        item.component_detections, "detection"
    )
    return (
        f"What could have been decided (tier '{item.tier_name}', {scope} decided together; costs "
        "in nats):\n" + _aligned(rows, left={0, len(rows[0]) - 1}) + _and_more(item)
    )


def _and_more(item: Decision) -> str:
    left = len(item.alternatives) - SHOWN_OPTIONS
    return f"\n  … and {left} more, none better (all are in --json)" if left > 0 else ""


def _seen_from_track(item: Decision) -> bool:
    return any(option.decision == "miss" for option in item.alternatives)


def _option_name(option: Alternative, by_track: bool) -> str:
    star = " *" if option.source == RECOMPUTED else ""
    if option.decision == "miss":
        return f"no detection (missed){star}"
    if option.decision == "new":
        return f"no track (new){star}"
    if by_track:
        return detection_name(option.detection, option.line) + star
    return f"track {option.track}{star}"


def _role(option: Alternative, by_track: bool) -> str:
    roles = ["chosen"] if option.chosen else []
    if option.runner_up:
        roles.append("runner-up")
    if by_track and option.held_by is not None:
        roles.append(f"given to track {option.held_by}")
    if not by_track and option.holds is not None:
        roles.append(f"it was given detection {option.holds}")
    return ", ".join(roles)


def _outside(item: Decision) -> str:
    if not item.outside:
        return ""
    by_track = _seen_from_track(item)
    lines = []
    for near in item.outside:
        name = detection_name(near.detection, near.line) if by_track else f"track {near.track}"
        overlap = "" if near.gate.overlap is None else f" (IoU {near.gate.overlap:.2f})"
        why = gate_words(near.gate).removeprefix("outside the gate: ")
        lines.append(_wrapped(f"  {name}{overlap}: {why}"))
    return "Nearest outside the gate (from predictions and detections):\n" + "\n".join(lines)


def _birth(told: Explanation) -> str:
    view = told.detection_view(told.detection)
    if view is None:
        born = told.track_view(told.track)
        if born is None or born.born_frame != told.frame:
            return ""
        if born.detection is None:
            return f"Track {born.track} was born in this frame."
        name = detection_name(born.detection, told.line_of(born.detection))
        return f"Track {born.track} was born in this frame, from {name}."
    if view.starts_track:
        return f"It started track {view.track}."
    if view.track is None:
        score = "" if view.score is None else f" (score {view.score:g})"
        return f"It started no track{score}; see lifecycle.birth_score in the run's settings."
    return ""


def _why_not(told: Explanation, item: WhyNot) -> str:
    pair = f"track {item.track} and {detection_name(item.detection, item.line)}"
    reason = item.reason[0].upper() + item.reason[1:]
    return _wrapped(f"Why not {pair}? {reason}.")


def _track(told: Explanation) -> str:
    subject = told.track if told.track is not None else _track_of_detection(told)
    view = told.track_view(subject)
    if view is None:
        return ""
    life = [f"born in frame {view.born_frame}"]
    if view.confirmed_frame is not None:
        life.append(f"confirmed in frame {view.confirmed_frame}")
    said = [f"Track {view.track} at the time: {', '.join(life)}."]
    if view.state is not None:
        unseen = f", last detection {view.unseen_seconds:.3g} s before"
        said.append(f"  {view.state}{unseen}; after this frame {view.state_after}.")
    if view.position:
        where = ", ".join(
            f"{name} {_measured(value, view.sigma[name])}" for name, value in view.position.items()
        )
        centre = " (x, y: centre)" if told.kind == "box" else ""
        said.append(f"  expected at {where}{centre}")
    if view.detection is not None:
        seen = told.detection_view(view.detection)
        assert seen is not None
        where = ", ".join(
            f"{name} {_measured(value, seen.sigma[name])}" for name, value in seen.position.items()
        )
        said.append(f"  detected at {where}")
    if view.confidence is not None:
        said.append(f"  identity confidence after it {view.confidence:.3f}")
    said.append(f"  afterwards: {view.afterwards}")
    return "\n".join(map(_wrapped, said))


def _track_of_detection(told: Explanation) -> int | None:
    view = told.detection_view(told.detection)
    return None if view is None else view.track


def _history(told: Explanation) -> str:
    if not told.history:
        return ""
    rows = [["", "frame", "time", "state", "decision", "margin", "odds", "confidence", ""]]
    rows += [_moment(item, item.frame == told.frame) for item in told.history]
    return "Before and after:\n" + _aligned(rows, left={0, 3, 4, 8})


def _moment(item: Moment, now: bool) -> list[str]:
    decision = {"pair": detection_name(item.detection, item.line), "miss": "missed"}.get(
        item.decision, item.decision
    )
    if item.decision == "born" and item.line is not None:
        decision = f"born (line {item.line})"
    told = [event for event in item.events if event not in (item.decision, "missed")]
    return [
        "→" if now else "",
        str(item.frame),
        "" if item.time is None else f"{item.time:.3f}",
        item.state or EMPTY,
        decision,
        EMPTY if item.margin is None else nats(item.margin),
        item.odds or EMPTY,
        EMPTY if item.confidence is None else f"{item.confidence:.3f}",
        ", ".join([*(["contested"] if item.contested else []), *told]),
    ]


def _others(told: Explanation) -> str:
    """What became of the other tracks: those in the runner-up and 'why not' first."""
    subject = told.track if told.track is not None else _track_of_detection(told)
    options = [item.runner_up for item in told.decisions]
    options += [answer.alternative for answer in told.why_not]
    involved = {answer.track for answer in told.why_not}
    for option in options:
        if option is not None:
            involved |= {change.track for change in option.changes if change.track is not None}
    views = [view for view in told.tracks if view.track != subject]
    views.sort(key=lambda view: (view.track not in involved, view.track))
    lines = [_wrapped(f"  track {v.track}: {_fate(told, v)}") for v in views[:SHOWN_OTHERS]]
    if len(views) > SHOWN_OTHERS:
        lines.append(f"  … and {len(views) - SHOWN_OTHERS} more (in --json)")
    return "The other tracks named:\n" + "\n".join(lines) if lines else ""


def _count(number: int, noun: str) -> str:
    return f"{number} {noun}" + ("" if number == 1 else "s")


def _fate(told: Explanation, view: TrackView) -> str:
    """What another track was and got, and what became of it."""
    got = "no detection"
    if view.detection is not None:
        got = detection_name(view.detection, told.line_of(view.detection))
    margin = "" if view.margin is None else f" (margin {nats(view.margin)})"
    if view.state is not None:
        return f"{view.state}, got {got}{margin}; afterwards {view.afterwards}"
    if view.born_frame == told.frame:
        return f"born from {got}; afterwards {view.afterwards}"
    if view.ended_frame is not None and view.ended_frame <= told.frame:
        return f"ended in frame {view.ended_frame}"
    return f"not yet born; {view.afterwards}"


def _measured(value: float, sigma: float) -> str:
    """A value with its standard deviation, two digits of the latter."""
    decimals = 0
    if sigma > 0.0 and math.isfinite(sigma):
        decimals = min(max(1 - math.floor(math.log10(sigma)), 0), 9)
    return f"{value:.{decimals}f} ± {sigma:.{decimals}f}"


def _wrapped(text: str, hang: str = "    ") -> str:
    """Lines of bearable length; those after the first stand in by `hang`."""
    return textwrap.fill(
        text, LINE_LENGTH, subsequent_indent=hang, break_long_words=False, break_on_hyphens=False
    )


def _aligned(rows: Sequence[Sequence[str]], left: Iterable[int]) -> str:
    """Columns of equal width, right-aligned but for `left`; empty columns vanish."""
    kept = [c for c in range(len(rows[0])) if any(row[c] for row in rows)]
    widths = {c: max(len(row[c]) for row in rows) for c in kept}
    stay = set(left)
    return "\n".join(
        (
            "  "
            + "  ".join(
                row[c].ljust(widths[c]) if c in stay else row[c].rjust(widths[c]) for c in kept
            )
        ).rstrip()
        for row in rows
    )
