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
    "MOTP is a distance (1 - IoU for boxes): lower is better. MT/PT/ML: objects tracked in at "
    "least 80%, in between, in less than 20% of their frames."
)

# Heading, and how a cell is made.
COLUMNS = (
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
    ("FP", lambda s: str(s.counts.false_positives)),
    ("misses", lambda s: str(s.counts.misses)),
    ("switch", lambda s: str(s.counts.switches)),
    ("frag", lambda s: str(s.counts.fragmentations)),
    (
        "MT/PT/ML",
        lambda s: f"{s.counts.mostly_tracked}/{s.counts.partially_tracked}/{s.counts.mostly_lost}",
    ),
)


DETAILS_LEGEND = (
    "GOSPA and OSPA: root mean square over frames, lower is better; localisation, missed and false "
    "are the mean squares that GOSPA is made of. Durations in frames, as median (largest): track "
    "length; frames before an object is found; gaps between its pairings; time until it has its "
    "own track again, and how many objects never had it again."
)
DETAILS = (
    ("LocA", lambda s: _percent(s.loca)),
    ("GOSPA", lambda s: _number(s.set_distances.scores()["gospa"])),
    ("localis.", lambda s: _number(s.set_distances.scores()["gospa_localisation"])),
    ("missed", lambda s: _number(s.set_distances.scores()["gospa_missed"])),
    ("false", lambda s: _number(s.set_distances.scores()["gospa_false"])),
    ("OSPA", lambda s: _number(s.set_distances.scores()["ospa"])),
    ("length", lambda s: _lasting(s, "track_frames")),
    ("delay", lambda s: _lasting(s, "frames_to_first_match")),
    ("gaps", lambda s: _lasting(s, "gap_frames")),
    ("recovery", lambda s: _lasting(s, "identity_recovered_frames")),
    ("lost", lambda s: str(len(s.durations.values["identity_lost_frames"]))),
)


def scores_table(evaluation: Evaluation) -> str:
    """One line a sequence and, for several, one overall; then one a class, if any."""
    return _table(evaluation, COLUMNS)


def details_table(evaluation: Evaluation) -> str:
    """Localisation, set distances and durations, in the lines of `scores_table`."""
    return _table(evaluation, DETAILS)


def thresholds_table(evaluation: Evaluation) -> str:
    """HOTA and its parts at each threshold, over all sequences."""
    lines = ["similarity   HOTA   DetA   AssA   LocA"]
    for threshold, found in evaluation.overall.hota_counts.by_threshold().items():
        cells = "  ".join(_percent(found[name]).rjust(5) for name in ACCURACIES)
        lines.append(f"{threshold:>10}  {cells}")
    return "\n".join(lines)


def _table(evaluation: Evaluation, columns: Sequence[tuple[str, Callable[[Scores], str]]]) -> str:
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
