"""Scores as a table for people."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np

from tracker.evaluation.evaluate import Evaluation
from tracker.evaluation.hota import ACCURACIES
from tracker.evaluation.scores import Scores

CAUTION = (
    "Scores describe these sequences and this truth only. Tracks can be wrong, and tracks of "
    "people are personal data: follow the law and the licensed practice that apply where you are."
)
LEGEND = (
    "MOTP is a mean distance (1 - IoU of boxes, the log's unit of points): lower is better. "
    "Truth and tracked: rows that are scored. MT, PT, ML: objects tracked in at least 80%, in "
    "between, in less than 20% of their frames."
)
DETAILS_LEGEND = (
    "GOSPA and OSPA: root mean square over frames, lower is better; localisation, missed and false "
    "are the mean squares that GOSPA is made of. Durations in frames, as median (largest): track "
    "length; frames before an object is found; gaps between its pairings; time until it has its "
    "own track again, and how many objects never had it again."
)

# Heading, and how a cell is made. Four narrow tables instead of one: a terminal has 100 columns.
Columns = Sequence[tuple[str, Callable[[Scores], str]]]
RATIO_COLUMNS: Columns = (
    ("MOTA", lambda s: _percent(s.mota)),
    ("IDF1", lambda s: _percent(s.idf1)),
    ("HOTA", lambda s: _percent(s.hota)),
    ("DetA", lambda s: _percent(s.deta)),
    ("AssA", lambda s: _percent(s.assa)),
    ("IDP", lambda s: _percent(s.idp)),
    ("IDR", lambda s: _percent(s.idr)),
    ("prec.", lambda s: _percent(s.precision)),
    ("recall", lambda s: _percent(s.recall)),
    ("MOTP", lambda s: "-" if s.motp is None else f"{s.motp:.3f}"),
)
COUNT_COLUMNS: Columns = (
    ("objects", lambda s: str(s.counts.objects)),
    ("MT", lambda s: str(s.counts.mostly_tracked)),
    ("PT", lambda s: str(s.counts.partially_tracked)),
    ("ML", lambda s: str(s.counts.mostly_lost)),
    ("truth", lambda s: str(s.counts.truth_boxes)),
    ("tracked", lambda s: str(s.counts.track_boxes)),
    ("matches", lambda s: str(s.counts.matches)),
    ("FP", lambda s: str(s.counts.false_positives)),
    ("misses", lambda s: str(s.counts.misses)),
    ("switch", lambda s: str(s.counts.switches)),
    ("frag", lambda s: str(s.counts.fragmentations)),
)
DISTANCE_COLUMNS: Columns = (
    ("LocA", lambda s: _percent(s.loca)),
    ("GOSPA", lambda s: _number(s.set_scores["gospa"])),
    ("localisation", lambda s: _number(s.set_scores["gospa_localisation"])),
    ("missed", lambda s: _number(s.set_scores["gospa_missed"])),
    ("false", lambda s: _number(s.set_scores["gospa_false"])),
    ("OSPA", lambda s: _number(s.set_scores["ospa"])),
)
DURATION_COLUMNS: Columns = (
    ("length", lambda s: _lasting(s, "track_frames")),
    ("delay", lambda s: _lasting(s, "frames_to_first_match")),
    ("gaps", lambda s: _lasting(s, "gap_frames")),
    ("recovery", lambda s: _lasting(s, "identity_recovered_frames")),
    ("lost", lambda s: str(len(s.durations.values["identity_lost_frames"]))),
)


def scores_table(evaluation: Evaluation) -> str:
    """Ratios, then counts: a line a sequence, for several one overall, then one a class if any."""
    return _tables(evaluation, RATIO_COLUMNS, COUNT_COLUMNS)


def details_table(evaluation: Evaluation) -> str:
    """Distances, then durations, in the lines of `scores_table`."""
    return _tables(evaluation, DISTANCE_COLUMNS, DURATION_COLUMNS)


def thresholds_table(evaluation: Evaluation) -> str:
    """HOTA and its parts at each threshold, over all sequences."""
    lines = ["similarity   HOTA   DetA   AssA   LocA"]
    for threshold, found in evaluation.overall.hota_counts.by_threshold().items():
        cells = "  ".join(_percent(found[name]).rjust(5) for name in ACCURACIES)
        lines.append(f"{threshold:>10}  {cells}")
    return "\n".join(lines)


def _tables(evaluation: Evaluation, *parts: Columns) -> str:
    return "\n\n".join(_table(evaluation, columns) for columns in parts)


def _table(evaluation: Evaluation, columns: Columns) -> str:
    rows: list[tuple[str, Scores]] = list(evaluation.sequences.items())
    if len(rows) > 1:
        rows.append(("OVERALL", evaluation.overall))
    rows += [(f"class {label}", scores) for label, scores in evaluation.classes.items()]
    table = [["sequence", *(heading for heading, _ in columns)]]
    table += [[name, *(cell(scores) for _, cell in columns)] for name, scores in rows]
    widths = [max(len(line[k]) for line in table) for k in range(len(table[0]))]
    lines = []
    for line in table:
        first = line[0].ljust(widths[0])
        rest = (text.rjust(width) for text, width in zip(line[1:], widths[1:], strict=True))
        lines.append("  ".join((first, *rest)).rstrip())
    lines.insert(1, "-" * max(len(line) for line in lines))
    return "\n".join(lines)


def _number(value: float | None) -> str:
    return "-" if value is None else f"{value:.4g}"


def _lasting(scores: Scores, name: str) -> str:
    values = scores.durations.values[name]
    return f"{np.median(values):g} ({values.max()})" if len(values) else "-"


def _percent(value: float | None) -> str:
    return "-" if value is None else f"{100 * value:.1f}%"
