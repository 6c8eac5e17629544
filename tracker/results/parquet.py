"""How this project writes Parquet: row groups, zstd, dictionaries only where they pay."""

from __future__ import annotations

from pathlib import Path

import pyarrow as pa
import pyarrow.parquet as pq

ROW_GROUP = 65_536
# Numbers that repeat over many neighbouring rows; for others a dictionary costs time and space.
REPEATING = ("frame", "time", "tier")


def open_parquet(path: Path, schema: pa.Schema) -> pq.ParquetWriter:
    """A writer for tables of that schema."""
    dictionaries = [
        field.name for field in schema if pa.types.is_string(field.type) or field.name in REPEATING
    ]
    return pq.ParquetWriter(path, schema, compression="zstd", use_dictionary=dictionaries)
