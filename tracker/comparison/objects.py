"""Which objects got better or worse from one run to the other."""

from __future__ import annotations

import csv
from collections.abc import Sequence
from dataclasses import asdict, dataclass
from pathlib import Path
from typing import Any

import numpy as np

from tracker.comparison.rows import TruthRows
from tracker.errors import OutputError
from tracker.log.model import Ints, Truth
from tracker.results.folder import atomic_file

# What is summed up of an object's rows; an object differs where one of them does.
COUNTED = ("paired", "own", "switched", "resumed")


@dataclass(frozen=True, slots=True)
class ObjectChange:
    """One object of the truth in both runs.

    frames : annotated and scored.   covered : of them, paired with any track.   own_track : of
    them, on the one track that the identity metrics give it over the whole sequence.
    first_difference : the first frame in which the runs disagree about one of them, or about a
    switch or a new fragment; None if they never do.
    """

    sequence: str
    object: str
    label: str
    frames: int
    first_frame: int
    last_frame: int
    covered_a: int
    covered_b: int
    own_track_a: int
    own_track_b: int
    switches_a: int
    switches_b: int
    fragments_a: int
    fragments_b: int
    first_difference: int | None

    @property
    def gain(self) -> tuple[int, int, int, int]:
        """What B has more: frames on the own track, then frames covered, then fewer switches, then
        fewer fragments; compared in this order."""
        return (
            self.own_track_b - self.own_track_a,
            self.covered_b - self.covered_a,
            self.switches_a - self.switches_b,
            self.fragments_a - self.fragments_b,
        )

    @property
    def verdict(self) -> str:
        """`better`, `worse`, or `same`."""
        nothing = (0, 0, 0, 0)
        return "better" if self.gain > nothing else "worse" if self.gain < nothing else "same"

    @property
    def changed(self) -> bool:
        return self.first_difference is not None

    def as_dict(self) -> dict[str, Any]:
        return asdict(self) | {"verdict": self.verdict}


def object_changes(
    name: str, truth: Truth, numbers: Ints, rows: tuple[TruthRows, TruthRows]
) -> list[ObjectChange]:
    """Every scored object of one sequence.

    numbers : (F,) frame numbers of run A.   rows : what the runs made of the annotated rows.
    """
    _, at_a, at_b = np.intersect1d(
        rows[0].truth_row, rows[1].truth_row, assume_unique=True, return_indices=True
    )
    a, b = rows
    apart = np.any([getattr(a, n)[at_a] != getattr(b, n)[at_b] for n in COUNTED], axis=0)
    frame = numbers[a.frame[at_a]]
    who = truth.object[a.truth_row[at_a]]
    label = truth.label[a.truth_row[at_a]]
    order = np.lexsort((frame, who))
    out = []
    for of in np.split(order, np.flatnonzero(np.diff(who[order])) + 1) if len(order) else ():
        different = frame[of][apart[of]]
        codes = label[of][label[of] >= 0]
        out.append(
            ObjectChange(
                name,
                truth.object_names[who[of[0]]],
                truth.labels[np.bincount(codes).argmax()] if len(codes) else "",
                len(of),
                int(frame[of[0]]),
                int(frame[of[-1]]),
                covered_a=int(a.paired[at_a[of]].sum()),
                covered_b=int(b.paired[at_b[of]].sum()),
                own_track_a=int(a.own[at_a[of]].sum()),
                own_track_b=int(b.own[at_b[of]].sum()),
                switches_a=int(a.switched[at_a[of]].sum()),
                switches_b=int(b.switched[at_b[of]].sum()),
                fragments_a=int(a.resumed[at_a[of]].sum()),
                fragments_b=int(b.resumed[at_b[of]].sum()),
                first_difference=int(different[0]) if len(different) else None,
            )
        )
    return out


def worst_first(changes: Sequence[ObjectChange]) -> list[ObjectChange]:
    """The objects that differ at all, the greatest loss first."""
    return sorted((item for item in changes if item.changed), key=lambda item: item.gain)


def write_objects(path: Path, changes: Sequence[ObjectChange]) -> None:
    """Write the objects as a table with a header: tabs for .tsv, commas otherwise.

    Raises OutputError where it cannot be written.
    """
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
    except OSError as error:
        raise OutputError(f"cannot be written: {error.strerror}", path=path) from None
    columns = [*ObjectChange.__dataclass_fields__, "verdict"]
    with atomic_file(path) as working, working.open("w", encoding="utf-8", newline="") as file:
        writer = csv.DictWriter(
            file,
            columns,
            delimiter="\t" if path.suffix.lower() == ".tsv" else ",",
            lineterminator="\n",
        )
        writer.writeheader()
        writer.writerows(item.as_dict() for item in changes)
