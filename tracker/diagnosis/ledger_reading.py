"""Read the ledger of a run folder, only the frames that are asked for.

The Parquet files are sorted by frame and written a row group at a time, so the statistics in
their footers say which row groups hold a frame; the others are never decoded.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path

import pyarrow as pa
import pyarrow.compute as pc
import pyarrow.csv
import pyarrow.parquet as pq

from tracker.errors import InputError
from tracker.ledger import filter_names
from tracker.log.model import Kind
from tracker.results.read import looked_back, read_facts
from tracker.results.tracks import TRACKS, TRACKS_ONLINE
from tracker.results.write import EVENT_COLUMNS
from tracker.settings import load_settings

# Every frame with a live track or a detection has a row in one of these.
FRAME_FILES = ("predictions", "detections")


@dataclass(frozen=True, slots=True)
class Event:
    """One change of a track's state; `before` is None at birth."""

    frame: int
    time: float
    track: int
    before: str | None
    after: str
    reason: str


@dataclass(frozen=True, slots=True)
class _Group:
    """One row group of a Parquet file, and the frames in it."""

    number: int
    first: int
    last: int


class RunLedger:
    """A run folder, opened to be explained.

    Raises InputError if it is no run, has no ledger or lacks a file, SettingsError for settings
    that this version does not know.
    """

    def __init__(self, folder: str | Path) -> None:
        self.folder = Path(folder)
        self.facts = read_facts(folder)
        self.settings = load_settings(self.folder / "settings.toml")
        self.level = self.settings.ledger.level
        if self.level == "none":
            raise InputError(
                "was made without a ledger (ledger.level is 'none'), so nothing can be explained",
                path=folder,
                remedy="Run 'margent associate' again with --set ledger.level=full (every "
                "candidate) or contested (the close calls).",
            )
        try:
            self.kind = Kind(self.facts["kind"])
            self.name = str(self.facts["name"])
            self.frame_count = int(self.facts["counts"]["frames"])
        except (KeyError, TypeError, ValueError) as error:
            raise InputError(
                f"is not what this version writes: {error}", path=self.folder / "run.json"
            ) from None
        self.coordinates = filter_names(self.kind)
        # The ledger speaks of the engine's tracks; a run that looked back has others in `tracks`.
        self.looked_back = looked_back(folder)
        self.own_tracks = TRACKS_ONLINE if self.looked_back else TRACKS

    def rows(
        self,
        name: str,
        first: int,
        last: int,
        *,
        columns: Iterable[str] | None = None,
        track: int | None = None,
    ) -> pa.Table:
        """Rows of ``NAME.parquet`` with first ≤ frame ≤ last, and of one track if asked."""
        wanted = (pc.field("frame") >= first) & (pc.field("frame") <= last)
        if track is not None:
            wanted &= pc.field("track") == track
        return self._read(name, wanted, None if columns is None else list(columns))

    def frames_around(self, frame: int, before: int, after: int) -> tuple[list[int], list[int]]:
        """The nearest recorded frames: at most `before` earlier and `after` later ones, in order.

        A frame without live tracks and detections leaves no trace in a run and is not among them.
        """
        earlier: set[int] = set()
        later: set[int] = set()
        for name in FRAME_FILES:
            groups = self._groups(name)
            behind = [group for group in reversed(groups) if group.first < frame]
            ahead = [group for group in groups if group.last > frame]
            earlier |= self._frames(name, behind, range(-(2**62), frame), before)
            later |= self._frames(name, ahead, range(frame + 1, 2**62), after)
        return sorted(earlier, reverse=True)[:before][::-1], sorted(later)[:after]

    def first_and_last(self) -> tuple[int, int] | None:
        """Smallest and largest recorded frame number, None for a run without any."""
        groups = [group for name in FRAME_FILES for group in self._groups(name)]
        if not groups:
            return None
        return min(group.first for group in groups), max(group.last for group in groups)

    def frames_of_line(self, line: int) -> list[int]:
        """Frames with a detection from a source line."""
        return sorted(
            set(self._read("detections", pc.field("line") == line, ["frame"])["frame"].to_pylist())
        )

    def rejection_of_line(self, line: int) -> str | None:
        """Why a source line was rejected, None if it was not."""
        path = self.folder / "rejected.csv"
        if not path.is_file():
            return None
        quoted = pa.csv.ParseOptions(newlines_in_values=True)
        with _named(path):
            table = pa.csv.read_csv(path, parse_options=quoted)
            reasons = table.filter(pc.field("line") == line)["reason"].to_pylist()
        return str(reasons[0]) if reasons else None

    def events(self, *, track: int | None = None, frame: int | None = None) -> list[Event]:
        """Events of a track or of a frame, in order."""
        table = self._all_events
        if track is not None:
            table = table.filter(pc.field("track") == track)
        if frame is not None:
            table = table.filter(pc.field("frame") == frame)
        columns = [table[name].to_pylist() for name in EVENT_COLUMNS]
        return [Event(*values) for values in zip(*columns, strict=True)]

    @cached_property
    def _all_events(self) -> pa.Table:
        path = self.folder / "events.csv"
        options = pa.csv.ConvertOptions(
            column_types={
                "frame": pa.int64(),
                "time": pa.float64(),
                "track": pa.int64(),
                **{name: pa.string() for name in ("from", "to", "reason")},
            },
            strings_can_be_null=True,
            null_values=[""],
        )
        with _named(path):
            return pa.csv.read_csv(path, convert_options=options).select(EVENT_COLUMNS)

    def _read(self, name: str, wanted: pc.Expression, columns: list[str] | None) -> pa.Table:
        path = self._path(name)
        with _named(path):
            return pq.read_table(path, columns=columns, filters=wanted)

    def _path(self, name: str) -> Path:
        if not self.frame_count:
            raise InputError("has no frames, so there is nothing to explain", path=self.folder)
        path = self.folder / f"{name}.parquet"
        if not path.is_file():
            raise InputError(
                "is missing from the run folder",
                path=path,
                remedy="Copy the whole folder, or run 'margent associate' again.",
            )
        return path

    def _groups(self, name: str) -> list[_Group]:
        path = self._path(name)
        groups = []
        with _named(path):
            facts = pq.read_metadata(path)
            column = facts.schema.names.index("frame")
            for k in range(facts.num_row_groups):
                frames = facts.row_group(k).column(column).statistics
                if frames is not None and frames.has_min_max:
                    groups.append(_Group(k, frames.min, frames.max))
        return groups

    def _frames(self, name: str, groups: list[_Group], wanted: range, count: int) -> set[int]:
        """Frame numbers in the order of `groups`, until there are `count` of the wanted ones."""
        found: set[int] = set()
        if count:
            path = self._path(name)
            with _named(path), pq.ParquetFile(path) as file:
                for group in groups:
                    frames = file.read_row_group(group.number, columns=["frame"])["frame"]
                    found.update(f for f in frames.unique().to_pylist() if f in wanted)
                    if len(found) >= count:
                        break
        return found


@contextmanager
def _named(path: Path) -> Iterator[None]:
    """Turn a reader's errors into one that names the file."""
    try:
        yield
    except (OSError, KeyError, ValueError, pa.ArrowException) as error:
        raise InputError(
            f"cannot be read as part of a run: {error}",
            path=path,
            remedy="If the file is damaged or from another version, run 'margent associate' again.",
        ) from None
