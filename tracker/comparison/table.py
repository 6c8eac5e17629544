"""A comparison as text for people."""

from __future__ import annotations

import shlex
from collections.abc import Iterator, Mapping, Sequence
from pathlib import Path
from typing import Any

from tracker.comparison.changed_settings import ChangedSetting
from tracker.comparison.model import Change, Comparison
from tracker.comparison.objects import worst_first
from tracker.comparison.parting import Difference, Parting
from tracker.comparison.tolerance import Judgement
from tracker.evaluation.scores import RATIOS

# Heading by score; the others are in --json.
SHOWN = {
    "hota": "HOTA", "deta": "DetA", "assa": "AssA", "mota": "MOTA", "motp": "MOTP", "idf1": "IDF1",
    "idp": "IDP", "idr": "IDR", "precision": "precision", "recall": "recall",
    "switches": "switches", "fragmentations": "fragmentations",
    "false_positives": "false positives", "misses": "misses", "mostly_tracked": "mostly tracked",
    "mostly_lost": "mostly lost", "gospa": "GOSPA", "ospa": "OSPA",
}  # fmt: skip
BY_SEQUENCE = ("idf1", "hota", "mota", "switches")
LISTED = 5  # differences of a frame, sequences that part, sequences of a setting
LEGEND = (
    "Differences of ratios are in percentage points. MOTP, GOSPA and OSPA are distances: lower is "
    "better. 'B better': share of resamples in which B is better. An interval is about sequences "
    "like these; it does not know of conditions that are not among them."
)


def changes_table(found: Comparison) -> str:
    """Both runs' overall scores, their difference, its interval, and what it says."""
    plan = found.resampling
    heading = f"{100 * plan.confidence:g}% interval" if plan else "interval"
    rows = [("score", "A", "B", "B - A", heading, "B better", "")]
    for name, title in SHOWN.items():
        change = found.overall[name]
        rows.append(
            (
                title,
                _value(name, change.a),
                _value(name, change.b),
                _difference(name, change.difference),
                _interval(change),
                "-" if change.b_better is None else f"{100 * change.b_better:.0f}%",
                "" if change.verdict == "unknown" else change.verdict,
            )
        )
    return _aligned(rows, "<>>>>><")


def sequences_table(found: Comparison) -> str:
    """The main scores of each sequence in A and B."""
    rows = [("sequence", *(SHOWN[name] for name in BY_SEQUENCE), "IDF1, B - A")]
    for name, changes in found.sequences.items():
        cells = [f"{_value(n, changes[n].a)} → {_value(n, changes[n].b)}" for n in BY_SEQUENCE]
        rows.append((name, *cells, _difference("idf1", changes["idf1"].difference)))
    return _aligned(rows, "<" + ">" * (len(BY_SEQUENCE) + 1))


def resampling_words(found: Comparison) -> str:
    """What the intervals come from."""
    plan = found.resampling
    if plan is None:
        return ""
    what = (
        f"{plan.units} sequences"
        if plan.unit == "sequence"
        else f"{plan.units} blocks of {plan.block_seconds:g} s"
    )
    return f"Intervals: {plan.resamples} resamples of {what}, seed {plan.seed}."


def settings_table(settings: Sequence[ChangedSetting], sequences: int) -> str:
    """One line a setting that differs."""
    if not settings:
        return "settings: the same in both runs"
    rows = [("setting", "A", "B", "")]
    for item in settings:
        where = "" if len(item.sequences) == sequences else _few(item.sequences)
        rows.append((item.setting, _setting(item.a), _setting(item.b), where))
    return _aligned(rows, "<<<<")


def objects_table(found: Comparison, limit: int) -> str:
    """How many objects got better or worse, and the first `limit` of them, worst first."""
    verdicts = [item.verdict for item in found.objects]
    changed = worst_first(found.objects)
    title = (
        f"objects: {verdicts.count('worse')} worse, {verdicts.count('better')} better, "
        f"{verdicts.count('same')} the same in B"
    )
    if not changed or not limit:
        return title
    several = len(found.sequences) > 1
    rows = [
        (*(("sequence",) if several else ()), "object", "label", "frames", "own track", "covered",
         "switches", "fragments", "from frame", ""),
    ]  # fmt: skip
    for item in changed[:limit]:
        first = "-" if item.first_difference is None else str(item.first_difference)
        rows.append(
            (
                *((item.sequence,) if several else ()),
                item.object,
                item.label,
                f"{item.frames}",
                f"{item.own_track_a} → {item.own_track_b}",
                f"{item.covered_a} → {item.covered_b}",
                f"{item.switches_a} → {item.switches_b}",
                f"{item.fragments_a} → {item.fragments_b}",
                first,
                item.verdict,
            )
        )
    lines = [f"{title}, A → B, greatest loss first:", _aligned(rows, "<" * several + "<<>>>>>><")]
    if len(changed) > limit:
        lines.append(f"and {len(changed) - limit} more (--show-objects, --objects FILE, --json)")
    return "\n".join(lines)


def partings_text(found: Comparison, runs: Mapping[str, tuple[Path, Path]]) -> str:
    """Where the runs part, what differs there, and the commands that show it.

    runs : run folders or files by sequence; commands are named for folders with a ledger.
    """
    apart = {name: part for name, part in found.partings.items() if part.frame is not None}
    lines: list[str] = []
    for name, part in list(apart.items())[:LISTED]:
        lines += _parting(name, part, runs[name])
    if len(apart) > LISTED:
        lines.append(f"and in {len(apart) - LISTED} more sequences (--json has all)")
    same = [name for name in found.partings if name not in apart]
    if same:
        lines.append(f"{_few(same)}: both runs report the same rows and identities")
    moved = {n: p for n, p in found.partings.items() if p.moved_frame is not None}
    for name, part in list(moved.items())[:LISTED]:
        lines.append(
            f"{name}: places of the same rows differ from frame {part.moved_frame} on, there by "
            f"up to {part.moved_by:.3g}"
        )
    return "\n".join(lines)


def judgements_table(judgements: Sequence[Judgement]) -> str:
    """One line a tolerance: met or not, what was asked and what was found."""
    rows = [("", "tolerance", "B is")]
    rows += [("met" if item.met else "NOT MET", item.name, item.found) for item in judgements]
    return _aligned(rows, "<<<")


def _parting(name: str, part: Parting, runs: tuple[Path, Path]) -> Iterator[str]:
    yield f"{name}: the runs part in frame {part.frame} ({part.time:.3f} s)"
    for item in part.differences[:LISTED]:
        yield f"  {item.words}"
    if len(part.differences) > LISTED:
        yield f"  and {len(part.differences) - LISTED} more (--json has all)"
    for command in explain_commands(part, runs):
        yield f"  {command}"


def explain_commands(part: Parting, runs: tuple[Path, Path]) -> list[str]:
    """Commands that show what each run decided about the first difference."""
    if part.frame is None or not part.differences:
        return []
    first = part.differences[0]
    out = []
    for run, track in zip(runs, (first.track_a, first.track_b), strict=True):
        about = _about(first, track)
        if about and (run / "decisions.parquet").is_file():
            out.append(f"margent explain {shlex.quote(str(run))} --frame {part.frame} {about}")
    return out


def _about(item: Difference, track: int | None) -> str:
    if item.line is not None and (track is None or item.kind == "identity"):
        return f"--line {item.line}"
    return "" if track is None else f"--track {track}"


def _value(name: str, value: float | None) -> str:
    if value is None:
        return "-"
    if isinstance(value, int):
        return str(value)
    return f"{100 * value:.1f}%" if _is_percent(name) else f"{value:.4g}"


def _difference(name: str, value: float | None) -> str:
    """With its sign; differences of ratios in percentage points."""
    if value is None:
        return "-"
    if value == 0:
        return "0"
    if isinstance(value, int):
        return f"{value:+d}"
    return f"{100 * value:+.2f}" if _is_percent(name) else f"{value:+.3g}"


def _interval(change: Change) -> str:
    if change.lower is None or change.upper is None:
        return "-"
    ends = (_difference(change.score, end) for end in (change.lower, change.upper))
    return " to ".join(ends)


def _is_percent(name: str) -> bool:
    return name in RATIOS and name != "motp"


def _setting(value: Any) -> str:
    text = "-" if value is None else str(value)
    return text if len(text) <= 30 else f"{text[:29]}…"


def _few(names: Sequence[str]) -> str:
    more = f" and {len(names) - LISTED} more" if len(names) > LISTED else ""
    return ", ".join(names[:LISTED]) + more


def _aligned(rows: Sequence[Sequence[str]], sides: str) -> str:
    widths = [max(len(row[k]) for row in rows) for k in range(len(rows[0]))]
    return "\n".join(
        "  ".join(
            f"{cell:{side}{width}}" for cell, side, width in zip(row, sides, widths, strict=True)
        ).rstrip()
        for row in rows
    )
