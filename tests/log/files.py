"""Build the files that the log tests read."""

from __future__ import annotations

import csv
import io
import json
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

import motmetrics

# Open data that the registry package motmetrics ships: two sequences with truth and results.
SHIPPED = Path(motmetrics.__file__).parent / "data"

Rows = Mapping[str, Sequence[Any]]

BOXES: Rows = {
    "frame": [1, 1, 2, 4],
    "left": [10.0, 50.5, 11.0, 13.25],
    "top": [20.0, 60.0, 21.0, 23.0],
    "width": [30.0, 20.0, 30.0, 31.5],
    "height": [40.0, 50.0, 40.0, 41.0],
    "score": [0.9, 0.25, 0.875, 1.0],
    "label": ["person", "cart", "person", "bicycle"],
}
POINTS: Rows = {
    "frame": [1, 1, 2, 4],
    "x": [10.0, -50.5, 11.0, 13.25],
    "y": [20.0, 60.0, 21.0, 1e6],
}


def save(folder: Path, content: str | bytes, name: str = "log.csv") -> Path:
    """Write text (as UTF-8, line ends as given) or bytes, and return the path."""
    path = folder / name
    path.parent.mkdir(parents=True, exist_ok=True)
    path.write_bytes(content.encode() if isinstance(content, str) else content)
    return path


def delimited(rows: Rows, delimiter: str = ",") -> str:
    out = io.StringIO()
    writer = csv.writer(out, delimiter=delimiter, lineterminator="\n")
    writer.writerow(rows)
    writer.writerows(zip(*rows.values(), strict=True))
    return out.getvalue()


def ndjson(rows: Rows) -> str:
    records = zip(*rows.values(), strict=True)
    return "".join(json.dumps(dict(zip(rows, row, strict=True))) + "\n" for row in records)


def parquet(rows: Rows) -> bytes:
    import pyarrow as pa
    import pyarrow.parquet as pq

    out = io.BytesIO()
    pq.write_table(pa.table({name: list(cells) for name, cells in rows.items()}), out)
    return out.getvalue()


def benchmark(rows: Rows, delimiter: str = ",") -> str:
    """frame, id, left, top, width, height, confidence, -1, -1, -1."""
    lines = []
    for k in range(len(rows["frame"])):
        cells = [rows["frame"][k], rows["id"][k] if "id" in rows else -1]
        cells += [rows[name][k] for name in ("left", "top", "width", "height")]
        cells += [rows["score"][k] if "score" in rows else -1, -1, -1, -1]
        lines.append(delimiter.join(str(cell) for cell in cells) + "\n")
    return "".join(lines)


def boxes(text: str) -> str:
    """Rows below the header frame,left,top,width,height,score,label."""
    return "frame,left,top,width,height,score,label\n" + text
