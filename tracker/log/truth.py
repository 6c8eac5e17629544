"""Read annotated ground truth."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path

import numpy as np

from tracker.log.columns import Role
from tracker.log.detections import labels_of, measurement
from tracker.log.facts import name_of, read_facts
from tracker.log.identities import (
    check_identified,
    flags,
    identified_rows,
    optional_numbers,
)
from tracker.log.model import Truth
from tracker.log.recognise import read_table
from tracker.log.sieve import Sieve, settle
from tracker.log.source import locate, open_source

NOTHING = "the truth has column names but no row: nothing was there to be tracked"


def read_truth(
    path: str | Path,
    *,
    columns: Mapping[str, str] | None = None,
    format: str | None = None,
    strict: bool = False,
) -> Truth:
    """Read truth: rows with an identity, from any format that `read_log` reads.

    The identity is the column `object`, `track` or `id`; `scored` (1 or 0), `visibility` and
    `label` may be there. In the benchmark layout the rows are scored where the flag (or
    confidence) is not 0. A row is rejected if its object is in that frame already. A file with a
    header alone says that there was nothing.

    Parameters are those of `read_log`; a folder must have one file named ``truth.*``.

    Raises
    ------
    InputError for a file that cannot be used or has no identities, UsageError for arguments
    that make no sense, RejectedRowsError if `strict` and a row was rejected.
    """
    path = locate(path, "truth")
    facts = read_facts(path)
    source = open_source(path)
    table = read_table(source, role=Role.TRUTH, columns=columns, format=format)
    sieve = Sieve(table)
    identities = check_identified(sieve, path, Role.TRUTH)
    scored = flags(sieve, "scored")
    visibility = optional_numbers(sieve, "visibility")
    rejections = settle(sieve, path, strict=strict, may_be_empty=True)
    rows = identified_rows(sieve, identities)
    label, labels = labels_of(table, rows.row)
    return Truth(
        name=name_of(path, facts),
        path=path,
        digest=source.digest,
        format=table.format,
        kind=table.kind,
        facts=facts,
        frame=rows.frame,
        time=rows.time,
        object=rows.identity,
        object_names=rows.names,
        z=measurement(table, rows.row),
        label=label,
        line=table.line[rows.row],
        scored=scored[rows.row],
        visibility=np.array(visibility[rows.row]),
        labels=labels,
        rejections=rejections,
        notes=(*table.notes, *(() if len(table) else (NOTHING,))),
    )
