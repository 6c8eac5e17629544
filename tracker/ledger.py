"""The ledger: what was decided in each frame, and what the alternatives would have cost.

Three Parquet files, a row group every so many rows, so that memory stays bounded:

    decisions.parquet    one row a candidate, a missed track, a new detection
    predictions.parquet  one row a live track and frame: where it was expected
    detections.parquet   one row a detection: what was seen, with the noise assumed
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq
from numpy.typing import NDArray

from tracker.association import TierDecision
from tracker.association.rule import association_rules
from tracker.engine import FrameResult
from tracker.kernels.assignment import problem_frontier
from tracker.kernels.margin import force_costs
from tracker.log.model import Frame, Kind
from tracker.results.parquet import ROW_GROUP, open_parquet
from tracker.results.table import STATE_WORDS, label_words, lists, missing_if_nan
from tracker.settings import Settings

DECISION_WORDS = pa.array(["pair", "miss", "new"])
PAIR, MISS, NEW = 0, 1, 2

Columns = dict[str, NDArray]


class Ledger:
    """Collects frames and writes them; level 'none' writes nothing."""

    def __init__(
        self, folder: Path, kind: Kind, settings: Settings, labels: tuple[str, ...]
    ) -> None:
        self._level = settings.ledger.level
        self._limit = settings.ledger.contested_margin
        rules = association_rules(settings, kind)
        self._terms = sorted({name for rule in rules for name in rule.terms})
        self._names = filter_names(kind)
        self._corner = np.triu_indices(kind.dimension)
        self._files = {
            name: _ChunkedFile(folder / f"{name}.parquet", labels)
            for name in ("decisions", "predictions", "detections")
        }
        self.contested = 0

    def add(self, frame: Frame, result: FrameResult) -> None:
        """Take one frame in. The engine must have been told to explain."""
        if self._level == "none":
            return
        for tier in result.tiers:
            self._decisions(frame, result, tier)
        self._predictions(result)
        self._detections(frame, result)

    def close(self) -> None:
        """Write what is left."""
        for file in self._files.values():
            file.close()

    def _decisions(self, frame: Frame, result: FrameResult, tier: TierDecision) -> None:
        problem, solution = tier.problem, tier.solution
        answer, components = solution.answer, tier.components
        row_contested = solution.row_margin < self._limit
        column_contested = solution.column_margin < self._limit
        contested = np.zeros(len(components.candidates), np.bool_)
        contested[components.of_row[row_contested]] = True
        contested[components.of_column[column_contested]] = True
        whole = contested if self._level == "contested" else np.ones_like(contested)
        force = force_costs(problem, components, answer, whole, problem_frontier(problem))

        row = np.repeat(np.arange(len(problem.miss)), np.diff(problem.start))
        chosen = answer.row_candidate[row] == np.arange(len(row))
        kept = np.flatnonzero(chosen | whole[components.of_row[row]])
        missed = np.flatnonzero(answer.row_candidate < 0)
        new = np.flatnonzero(answer.column_row < 0)
        self.contested += int(row_contested.sum())
        self.contested += int(column_contested[new].sum())

        rows = row[kept]
        columns = problem.column[kept]
        track = result.considered[tier.track]
        none = np.full(len(new), -1, np.int64)
        one_more = np.full(len(missed), -1, np.int64)
        nan_missed, nan_new = np.full(len(missed), np.nan), np.full(len(new), np.nan)
        detection = np.concatenate((tier.detection[columns], one_more, tier.detection[new]))
        count = len(detection)
        filled: Columns = {
            "frame": np.full(count, result.number),
            "time": np.full(count, result.time),
            "tier": np.full(count, tier.tier, np.int32),
            "component": np.concatenate(
                (components.of_row[rows], components.of_row[missed], components.of_column[new])
            ),
            "decision": np.repeat(
                np.array([PAIR, MISS, NEW], np.int8), (len(kept), len(missed), len(new))
            ),
            "track": np.concatenate((track[rows], track[missed], none)),
            "detection": detection,
            "line": np.where(detection >= 0, frame.line[detection], -1)
            if len(frame)
            else detection,
            "chosen": np.concatenate((chosen[kept], np.ones(len(missed) + len(new), np.bool_))),
            "cost": np.concatenate((problem.cost[kept], problem.miss[missed], problem.new[new])),
            "distance": np.concatenate((tier.candidates.distance[kept], nan_missed, nan_new)),
            "overlap": np.concatenate((tier.candidates.overlap[kept], nan_missed, nan_new)),
            "track_price": np.concatenate(
                (answer.row_price[rows], answer.row_price[missed], nan_new)
            ),
            "detection_price": np.concatenate(
                (answer.column_price[columns], nan_missed, answer.column_price[new])
            ),
            "margin": np.concatenate(
                (
                    np.where(chosen[kept], solution.row_margin[rows], np.nan),
                    solution.row_margin[missed],
                    solution.column_margin[new],
                )
            ),
            "force_cost": np.concatenate(
                (np.where(chosen[kept], np.nan, force[kept]), nan_missed, nan_new)
            ),
        }
        filled["contested"] = contested[filled["component"]]
        for name in self._terms:
            values = np.full(count, np.nan)
            if name in tier.rule.terms:
                values[: len(kept)] = tier.terms[tier.rule.terms.index(name)][kept]
            filled[f"cost_{name}"] = values
        self._files["decisions"].add(filled)

    def _predictions(self, result: FrameResult) -> None:
        seen = result.prediction
        assert seen is not None, "the ledger needs an engine that explains"
        columns: Columns = {
            "frame": np.full(len(seen.state), result.number),
            "track": result.considered,
            "state": seen.state,
            "unseen_seconds": seen.unseen,
            "detection_probability": seen.detected,
        }
        for k, name in enumerate(self._names):
            columns[name] = seen.estimate[:, k]
        columns["covariance"] = seen.covariance[:, self._corner[0], self._corner[1]]
        self._files["predictions"].add(columns)

    def _detections(self, frame: Frame, result: FrameResult) -> None:
        seen = result.prediction
        assert seen is not None, "the ledger needs an engine that explains"
        columns: Columns = {
            "frame": np.full(len(frame), result.number),
            "detection": np.arange(len(frame)),
            "line": frame.line,
            "score": frame.score,
            "label": frame.label,
        }
        for k, name in enumerate(self._names):
            columns[name] = frame.z[:, k]
        for k, name in enumerate(self._names):
            columns[f"variance_{name}"] = seen.variance[:, k]
        self._files["detections"].add(columns)


class _ChunkedFile:
    """A Parquet file that is written a row group at a time."""

    def __init__(self, path: Path, labels: tuple[str, ...]) -> None:
        self._path = path
        self._labels = labels
        self._parts: list[Columns] = []
        self._rows = 0
        self._writer: pq.ParquetWriter | None = None

    def add(self, columns: Columns) -> None:
        self._parts.append(columns)
        self._rows += len(columns["frame"])
        if self._rows >= ROW_GROUP:
            self._flush()

    def close(self) -> None:
        self._flush()
        if self._writer is not None:
            self._writer.close()

    def _flush(self) -> None:
        if not self._parts:
            return
        table = pa.table(
            {
                name: self._arrow(name, np.concatenate([part[name] for part in self._parts]))
                for name in self._parts[0]
            }
        )
        if self._writer is None:
            self._writer = open_parquet(self._path, table.schema)
        self._writer.write_table(table, row_group_size=ROW_GROUP)
        self._parts, self._rows = [], 0

    def _arrow(self, name: str, values: NDArray) -> pa.Array:
        """Codes become words, -1 and nan become null, triangles become lists."""
        if name == "decision":
            return DECISION_WORDS.take(pa.array(values))
        if name == "state":
            return STATE_WORDS.take(pa.array(values))
        if name == "label":
            return label_words(values, self._labels)
        if name == "covariance":
            return lists(values)
        if name in ("track", "detection", "line"):
            return pa.array(values, mask=values < 0)
        if values.dtype.kind == "f":
            return missing_if_nan(values)
        return pa.array(values)


def filter_names(kind: Kind) -> tuple[str, ...]:
    """Columns in filter order: a box by its centre."""
    return {Kind.BOX: ("x", "y", "width", "height"), Kind.POINT: ("x", "y")}[kind]
