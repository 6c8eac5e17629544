"""A log's summary as a table of at most 80 columns."""

from __future__ import annotations

import textwrap

from tracker.log.model import Rejection
from tracker.log.summary import NEAR_IOU, QUANTILES, LogSummary, Scores, Spread

WIDTH = 80
_NAME = 14  # width of the column of names
_BAR = 40
_EIGHTHS = " ▏▎▍▌▋▊▉█"
_LABELS_SHOWN = 12


def summary_text(summary: LogSummary, *, unicode: bool = True) -> str:
    """The table; without `unicode` it is ASCII, with '?' for characters that are not."""
    lines = [_clip(summary.name, WIDTH), "─" * WIDTH if unicode else "-" * WIDTH]
    lines += _facts(summary)
    if summary.scores is not None:
        lines += ["", *_spread_table({"score": summary.scores.spread} | summary.ranges)]
        lines += ["", *_histogram(summary.scores, unicode)]
    else:
        lines += ["", *_spread_table(summary.ranges)]
    lines += _labels(summary)
    lines += _rejections(summary)
    lines += [""] if summary.notes else []
    for note in summary.notes:
        lines += _row("note", note)
    text = "\n".join(line.rstrip() for line in lines) + "\n"
    return text if unicode else text.encode("ascii", "replace").decode()


def _facts(summary: LogSummary) -> list[str]:
    s = summary
    per_frame = s.detections_per_frame
    size = (
        f"{s.facts.image_width:g} x {s.facts.image_height:g}"
        if s.facts.image_width and s.facts.image_height
        else "unknown"
    )
    lines = _row("file", s.path)
    lines += _row("format", f"{s.format}, {'boxes' if s.kind == 'box' else 'points'}{_extras(s)}")
    lines += _row("rows", f"{s.rows:,} used, {s.rejected:,} rejected")
    lines += _row("frames", f"{s.frames:,} with rows, {s.first_frame} to {s.last_frame}")
    if s.facts.frames is not None and s.facts.frames != s.frames:
        lines += _row("", f"sequence.toml says {s.facts.frames:,} frames")
    lines += _row("time", f"{s.first_time:.3f} s to {s.last_time:.3f} s")
    lines += _row("frame rate", f"{s.rate_hz:.6g} Hz ({s.rate_source})")
    lines += _row("missing", _gaps(s))
    lines += _row(
        "per frame",
        f"{per_frame.smallest:.0f} at least, median {per_frame.quantiles[2]:g}, "
        f"{per_frame.largest:.0f} at most",
    )
    if s.kind == "box":
        lines += _row("image size", size)
    if s.outside is not None:
        lines += _row(
            "out of image", f"{s.outside.partly:,} boxes partly, {s.outside.wholly:,} wholly"
        )
    if s.near_duplicates is not None:
        least, more = (
            ("", "") if s.near_duplicates.complete else ("at least ", "; not all compared")
        )
        pairs = f"{least}{s.near_duplicates.pairs:,} pairs of boxes in one frame"
        lines += _row(
            "duplicates",
            f"{pairs} with IoU > {NEAR_IOU:g}{more}",
        )
    return lines


def _extras(summary: LogSummary) -> str:
    extras = ["sigma columns"] if summary.has_sigma else []
    if summary.embedding_size:
        extras.append(f"embeddings of {summary.embedding_size} numbers")
    return f", with {' and '.join(extras)}" if extras else ""


def _gaps(summary: LogSummary) -> str:
    if not summary.gap_count:
        return "none"
    longest = ", ".join(
        f"{gap.missing} after frame {gap.after} ({gap.seconds:.3g} s)"
        for gap in summary.longest_gaps
    )
    frames = "1 frame" if summary.missing_frames == 1 else f"{summary.missing_frames:,} frames"
    gaps = "1 gap" if summary.gap_count == 1 else f"{summary.gap_count:,} gaps"
    return f"{frames} in {gaps}; {'longest: ' if summary.gap_count > 1 else ''}{longest}"


def _spread_table(spreads: dict[str, Spread]) -> list[str]:
    heads = ["least", *(f"{q:.0%}" for q in QUANTILES), "most"]
    lines = [" " * _NAME + "".join(f"{head:>9}" for head in heads)]
    for name, spread in spreads.items():
        values = (spread.smallest, *spread.quantiles, spread.largest)
        lines.append(f"{name:<{_NAME}}" + "".join(f"{value:>9.4g}" for value in values))
    return lines


def _histogram(scores: Scores, unicode: bool) -> list[str]:
    lines = ["score"]
    top = max(scores.counts)
    for k, count in enumerate(scores.counts):
        low, high = scores.edges[k], scores.edges[k + 1]
        span = f"{low:>8.4g} to {high:<8.4g}"
        lines.append(f"  {span} {_bar(count / top, unicode):<{_BAR}} {count:>13,}")
    return lines


def _bar(share: float, unicode: bool) -> str:
    if not unicode:
        return "#" * max(round(share * _BAR), 1 if share > 0 else 0)
    eighths = max(round(share * _BAR * 8), 1 if share > 0 else 0)
    whole, rest = divmod(eighths, 8)
    return _EIGHTHS[8] * whole + (_EIGHTHS[rest] if rest else "")


def _labels(summary: LogSummary) -> list[str]:
    if not summary.labels:
        return []
    ranked = sorted(summary.labels.items(), key=lambda item: (-item[1], item[0]))
    lines = ["", "label"]
    lines += [f"  {_clip(name, 40):<40} {count:>13,}" for name, count in ranked[:_LABELS_SHOWN]]
    rest = ranked[_LABELS_SHOWN:]
    if rest:
        name = f"({len(rest)} more)"
        lines.append(f"  {name:<40} {sum(count for _, count in rest):>13,}")
    if summary.unlabelled:
        lines.append(f"  {'(none)':<40} {summary.unlabelled:>13,}")
    return lines


def _rejections(summary: LogSummary) -> list[str]:
    if not summary.rejected:
        return []
    lines = ["", f"would be rejected: {summary.rejected:,}"]
    for one in summary.rejections_by_reason:
        what = f"{one.column}: {one.reason}" if one.column else one.reason
        lines.append(f"  {one.count:>7,}  {_clip(what, 48):<48} first in {one.first_line}")
    lines.append("the first of them, by line")
    for rejection in summary.first_rejections:
        lines += _rejection(rejection)
    return lines


def _rejection(rejection: Rejection) -> list[str]:
    column = f"{rejection.column}: " if rejection.column else ""
    return [
        _clip(f"  {rejection.line:>7}  {column}{rejection.reason}", WIDTH),
        _clip(f"           {rejection.text}", WIDTH),
    ]


def _row(name: str, text: str) -> list[str]:
    """A name and a text that wraps in its own column."""
    parts = textwrap.wrap(_printable(text), WIDTH - _NAME) or [""]
    return [f"{name if k == 0 else '':<{_NAME}}{part}" for k, part in enumerate(parts)]


def _clip(text: str, width: int) -> str:
    text = _printable(text)
    return text if len(text) <= width else text[: width - 1] + "…"


def _printable(text: str) -> str:
    """Text from a file must not move the cursor or colour the terminal."""
    return "".join(mark if mark.isprintable() else "·" for mark in text)
