"""What the page of one run shows, as plain columns.

Coordinates and ledger numbers are whole numbers of a quantum, so that the page stays small.
"""

from __future__ import annotations

import json
from dataclasses import asdict
from pathlib import Path
from typing import Any

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
import pyarrow.parquet as pq
from numpy.typing import NDArray
from scipy.stats import chi2

from tracker.causes import SETTING, Error, Finding, diagnose
from tracker.errors import InputError
from tracker.evaluation import Scope, evaluate
from tracker.ledger import filter_names
from tracker.log.model import Floats, Ints, Kind, Truth
from tracker.report.thinning import frames_kept
from tracker.results import read_run
from tracker.results.read import read_facts
from tracker.settings import load_settings

LEDGER_DIGITS = 4  # behind the point, as written on the page
MARGIN_EDGES = (0.0, 0.1, 0.5, 1.0, 2.3, 4.6, 10.0, np.inf)
SCORES = ("hota", "idf1", "mota", "switches", "misses", "false_positives", "objects")
LEDGER_COLUMNS = ("cost", "distance", "overlap", "margin", "force_cost")


def gather(run: str | Path, truth: Truth | None = None, scope: Scope | None = None) -> dict:
    """Everything that the page of a run shows.

    Raises InputError for a folder that is no run or has no ledger, and what `evaluate` raises.
    """
    folder = Path(run)
    facts = read_facts(folder)
    tracks = read_run(folder)
    if not (folder / "decisions.parquet").is_file():
        raise InputError(
            "has no ledger (decisions.parquet)",
            path=folder,
            remedy="Associate again with ledger.level = 'contested' or 'all'.",
        )
    decisions = pq.read_table(folder / "decisions.parquet")
    seen = pq.read_table(folder / "detections.parquet")
    expected = pq.read_table(folder / "predictions.parquet")
    findings: tuple[Finding, ...] = ()
    scores = None
    if truth is not None:
        scope = scope or Scope()
        found = evaluate(tracks, truth, scope).as_dict()
        scores = {name: found[name] for name in SCORES}
        findings = diagnose(folder, truth, scope).findings
    numbers = [tracks.frame, seen["frame"].to_numpy(), expected["frame"].to_numpy()]
    if truth is not None:
        numbers.append(truth.frame)
    frames, rows = np.unique(np.concatenate(numbers), return_counts=True)
    contested = np.unique(decisions.filter(decisions["contested"])["frame"].to_numpy())
    errors = [frame for item in findings for frame in (item.frame, item.cause_frame)]
    kept = frames_kept(frames, rows, np.array(errors, np.int64), contested)
    shown = frames[kept]
    quantum = _quantum(tracks.z, seen, tracks.kind)
    times = dict(zip(tracks.frame.tolist(), tracks.time.tolist(), strict=True))
    return {
        "name": tracks.name,
        "kind": tracks.kind.value,
        "quantum": quantum,
        "frames": shown.tolist(),
        "times": [round(times[f], 3) if f in times else None for f in shown.tolist()],
        "left_out": {"frames": int(len(frames) - len(shown)), "of": len(frames)},
        "tracks": _track_columns(tracks, shown, quantum),
        "truth": _truth_columns(truth, shown, quantum),
        "detections": _places(seen, shown, quantum, tracks.kind) | _noise(seen, shown, quantum),
        "gates": _gates(expected, shown, quantum, tracks.kind),
        "gate_distance": _gate_distance(folder, tracks.kind),
        "ledger": _ledger(decisions, shown),
        "contested": np.intersect1d(contested, shown).tolist(),
        "findings": [_finding(item) for item in findings],
        "worst": _worst(findings),
        "scores": scores,
        "plots": _plots(decisions, frames, seen, tracks.kind),
        "run": facts,
        "settings": (folder / "settings.toml").read_text(encoding="utf-8"),
        "timings": _timings(folder),
    }


def _gate_distance(folder: Path, kind: Kind) -> float | None:
    """Largest d² inside the gate; None where the d² gate is off."""
    probability = load_settings(folder / "settings.toml").gate.probability
    return None if probability is None else float(chi2.ppf(probability, kind.dimension))


def _timings(folder: Path) -> Any:
    path = folder / "timings.json"
    return json.loads(path.read_text(encoding="utf-8")) if path.is_file() else None


def _quantum(z: Floats, seen: pa.Table, kind: Kind) -> float:
    """A tenth of a pixel for boxes; for points a 20,000th of the scene."""
    if kind is Kind.BOX:
        return 0.1
    places = np.concatenate([z[:, :2].ravel(), seen["x"].to_numpy(), seen["y"].to_numpy()])
    extent = float(np.ptp(places)) if len(places) else 1.0
    return max(extent, 1e-6) / 20_000


def _index(frame: Ints, shown: Ints) -> tuple[NDArray[np.bool_], list[int]]:
    """Rows whose frame is shown, and the frame's place in the page."""
    mask = np.isin(frame, shown)
    return mask, np.searchsorted(shown, frame[mask]).tolist()


def _whole(values: Floats, quantum: float) -> list[int]:
    return np.round(values / quantum).astype(np.int64).tolist()


def _track_columns(tracks: Any, shown: Ints, quantum: float) -> dict[str, Any]:
    mask, at = _index(tracks.frame, shown)
    columns = {
        "frame": at,
        "id": tracks.track[mask].tolist(),
        "state": tracks.state[mask].tolist(),
        "reported": tracks.reported[mask].astype(int).tolist(),
        "label": tracks.label[mask].tolist(),
        "labels": list(tracks.labels),
    }
    for k, name in enumerate(filter_names(tracks.kind)):
        columns[name] = _whole(tracks.z[mask, k], quantum)
    return columns


def _truth_columns(truth: Truth | None, shown: Ints, quantum: float) -> dict[str, Any] | None:
    if truth is None:
        return None
    mask, at = _index(truth.frame, shown)
    columns = {
        "frame": at,
        "object": truth.object[mask].tolist(),
        "names": list(truth.object_names),
    }
    for k, name in enumerate(filter_names(truth.kind)):
        columns[name] = _whole(truth.z[mask, k], quantum)
    return columns


def _places(table: pa.Table, shown: Ints, quantum: float, kind: Kind) -> dict[str, Any]:
    mask, at = _index(table["frame"].to_numpy(), shown)
    return {"frame": at} | {
        name: _whole(table[name].to_numpy()[mask], quantum) for name in filter_names(kind)
    }


def _noise(seen: pa.Table, shown: Ints, quantum: float) -> dict[str, Any]:
    """Variances of the detections' places, for the gate around a prediction."""
    mask, _ = _index(seen["frame"].to_numpy(), shown)
    return {
        name: _whole(seen[f"variance_{axis}"].to_numpy()[mask], quantum * quantum)
        for name, axis in (("xx", "x"), ("yy", "y"))
    }


def _gates(expected: pa.Table, shown: Ints, quantum: float, kind: Kind) -> dict[str, Any]:
    """Predicted places and the position part of their covariance, before the sensor's noise."""
    mask, _ = _index(expected["frame"].to_numpy(), shown)
    d = kind.dimension
    upper = expected["covariance"].combine_chunks().flatten().to_numpy()
    upper = upper.reshape(-1, d * (d + 1) // 2)[mask]
    columns = _places(expected, shown, quantum, kind)
    columns["id"] = expected["track"].to_numpy()[mask].tolist()
    for name, k in (("xx", 0), ("xy", 1), ("yy", d)):
        columns[name] = _whole(upper[:, k], quantum * quantum)
    return columns


def _ledger(decisions: pa.Table, shown: Ints) -> dict[str, Any]:
    mask, at = _index(decisions["frame"].to_numpy(), shown)
    table = decisions.filter(pa.array(mask))
    columns: dict[str, Any] = {
        "frame": at,
        "tier": table["tier"].to_pylist(),
        "component": table["component"].to_pylist(),
        "track": table["track"].to_pylist(),
        "detection": table["detection"].to_pylist(),
        "decision": table["decision"].to_pylist(),
        "chosen": pc.cast(table["chosen"], pa.int8()).to_pylist(),
        "contested": pc.cast(table["contested"], pa.int8()).to_pylist(),
    }
    for name in LEDGER_COLUMNS:
        rounded = pc.round(table[name], LEDGER_DIGITS).to_pylist()
        columns[name] = [v if v is None or np.isfinite(v) else "infinite" for v in rounded]
    return columns


def _finding(item: Finding) -> dict[str, Any]:
    words = asdict(item)
    words["setting"] = SETTING[item.cause]
    words["measure"] = item.measure if item.measure is None or np.isfinite(item.measure) else None
    return words


def _worst(findings: tuple[Finding, ...]) -> int | None:
    """The identity error that spoils most: a switch of the object with most switches."""
    switches = [k for k, item in enumerate(findings) if item.error is Error.SWITCH]
    if not switches:
        breaks = [k for k, item in enumerate(findings) if item.error is not Error.LATE]
        return max(breaks, key=lambda k: findings[k].rows, default=None)
    of_object: dict[str, int] = {}
    for k in switches:
        of_object[findings[k].object] = of_object.get(findings[k].object, 0) + 1
    return max(switches, key=lambda k: (of_object[findings[k].object], -findings[k].frame))


def _plots(decisions: pa.Table, frames: Ints, seen: pa.Table, kind: Kind) -> dict[str, Any]:
    chosen = decisions.filter(pc.and_(decisions["chosen"], pc.equal(decisions["decision"], "pair")))
    margin = np.array(chosen["margin"].to_numpy(), np.float64)
    margin = np.where(np.isnan(margin), np.inf, margin)
    distance = np.array(chosen["distance"].to_numpy(), np.float64)
    distance = distance[np.isfinite(distance)]
    edges = np.linspace(0.0, float(chi2.ppf(0.999, kind.dimension)), 21)
    counts, _ = np.histogram(distance, edges)
    expected = np.diff(chi2.cdf(edges, kind.dimension)) * len(distance)
    margins = np.digitize(margin, MARGIN_EDGES[1:-1])
    _, objects = np.unique(np.concatenate([frames, seen["frame"].to_numpy()]), return_counts=True)
    return {
        "margin_edges": list(MARGIN_EDGES[:-1]),
        "margin": np.bincount(margins, minlength=len(MARGIN_EDGES) - 1).tolist(),
        "distance_edges": np.round(edges, 2).tolist(),
        "distance": counts.tolist(),
        "expected": np.round(expected, 1).tolist(),
        "mean_distance": round(float(distance.mean()), 3) if len(distance) else None,
        "dimension": kind.dimension,
        "objects": (objects - 1).tolist()[:: max(1, len(objects) // 1000)],
    }
