"""Findings counted, what other settings would have admitted, and the worst of them."""

from __future__ import annotations

import csv
import io
from collections import Counter
from dataclasses import fields
from pathlib import Path
from typing import Any

from tracker.causes.diagnose import Diagnosis
from tracker.causes.model import SETTING, Cause, Error, Finding
from tracker.results.folder import atomic_file

GATE_PROBABILITIES = (0.99, 0.999, 0.9999, 0.99999, 0.999999)
COAST_SECONDS = (0.5, 1.0, 2.0, 3.0, 5.0, 10.0)
CONTEST_NATS = (0.5, 1.0, 2.3, 4.6)
WORST = 5


def cause_counts(findings: tuple[Finding, ...]) -> dict[Error, Counter[Cause]]:
    """How many errors of each kind have each cause."""
    counts: dict[Error, Counter[Cause]] = {}
    for item in findings:
        counts.setdefault(item.error, Counter())[item.cause] += 1
    return counts


def admitted(findings: tuple[Finding, ...]) -> dict[str, list[tuple[float, float]]]:
    """For each setting, the share of its findings that a value would have admitted.

    A gate at P_G admits a pair that needed no more; a coasting limit bridges gaps up to it; the
    contests are the share lost by at most so many nats.
    """
    curves: dict[str, list[tuple[float, float]]] = {}
    for cause, unit, name, values in (
        (Cause.GATE, "P_G needed", "gate.probability", GATE_PROBABILITIES),
        (Cause.ENDED, "s unseen", "lifecycle.coast_seconds", COAST_SECONDS),
        (Cause.CONTEST, "nats", "contests lost by at most (nats)", CONTEST_NATS),
    ):
        needed = [
            item.measure
            for item in findings
            if item.cause is cause and item.unit == unit and item.measure is not None
        ]
        if needed:
            curves[name] = [
                (value, sum(one <= value for one in needed) / len(needed)) for value in values
            ]
    return curves


def worst_objects(findings: tuple[Finding, ...]) -> list[tuple[str, int, int]]:
    """(object, switches, spoilt rows) of the objects with most switches, then most rows."""
    switches: Counter[str] = Counter()
    rows: Counter[str] = Counter()
    for item in findings:
        if item.object:
            switches[item.object] += item.error is Error.SWITCH
            rows[item.object] += item.rows if item.error is not Error.SWITCH else 0
    order = sorted(rows, key=lambda name: (-switches[name], -rows[name], name))
    return [(name, switches[name], rows[name]) for name in order[:WORST]]


def summary_text(diagnosis: Diagnosis) -> str:
    """The counts, what would have admitted what, and the worst, for people."""
    findings = diagnosis.findings
    lines = [f"Causes of the errors of {diagnosis.name}"]
    if not findings:
        return lines[0] + ": there are none\n"
    counts = cause_counts(findings)
    for error in Error:
        if error not in counts:
            continue
        total = counts[error].total()
        rows = sum(item.rows for item in diagnosis.of(error))
        spoilt = "" if error is Error.SWITCH else f", {rows} rows"
        lines.append(f"\n{_plural(error)}: {total}{spoilt}")
        for cause, count in counts[error].most_common():
            where = f"  → {SETTING[cause]}" if SETTING[cause] else ""
            lines.append(f"  {count:5d}  {count / total:4.0%}  {cause.value}{where}")
    for name, curve in admitted(findings).items():
        shown = ", ".join(f"{value:g}: {share:.0%}" for value, share in curve)
        lines.append(f"\n{name} would have admitted  {shown}")
    lines.append("\nWorst objects (switches, missed rows)")
    lines += [f"  {name}: {switches}, {rows}" for name, switches, rows in worst_objects(findings)]
    moments = sorted(diagnosis.of(Error.SWITCH), key=lambda item: item.frame)[:WORST]
    if moments:
        lines.append("\nFirst switches")
        lines += [
            f"  frame {item.frame}: object {item.object}, track {item.before} → {item.track}: "
            f"{item.cause.value} in frame {item.cause_frame} ({item.words})"
            for item in moments
        ]
    return "\n".join(lines) + "\n"


def _plural(error: Error) -> str:
    return {
        Error.SWITCH: "switches",
        Error.BREAK: "breaks",
        Error.MISS: "misses",
        Error.LATE: "late confirmations",
        Error.FALSE: "false tracks",
    }[error]


def summary_dict(diagnosis: Diagnosis) -> dict[str, Any]:
    """The same as plain values, for `--json`."""
    return {
        "causes": {
            error.value: {cause.value: count for cause, count in counter.most_common()}
            for error, counter in cause_counts(diagnosis.findings).items()
        },
        "admitted": {
            name: [{"value": value, "share": share} for value, share in curve]
            for name, curve in admitted(diagnosis.findings).items()
        },
        "worst_objects": [
            {"object": name, "switches": switches, "missed_rows": rows}
            for name, switches, rows in worst_objects(diagnosis.findings)
        ],
    }


def write_causes(diagnosis: Diagnosis, path: Path) -> None:
    """causes.csv: one row a finding. Raises OutputError where it cannot be written."""
    text = io.StringIO()
    rows = csv.writer(text, lineterminator="\n")
    names = [item.name for item in fields(Finding)]
    rows.writerow(names)
    for finding in diagnosis.findings:
        values = (getattr(finding, name) for name in names)
        rows.writerow(["" if value is None else value for value in values])
    with atomic_file(path) as working:
        working.write_text(text.getvalue(), encoding="utf-8")
