"""What looking back adds to a run folder: the objects' rows, and the links."""

from __future__ import annotations

from contextlib import closing
from pathlib import Path
from typing import Any

from tracker.hindsight.links_file import write_links
from tracker.hindsight.look_back import Hindsight, rows_in_hindsight
from tracker.log.model import DetectionLog
from tracker.results.track_files import TrackFiles
from tracker.results.tracks import TRACKS
from tracker.settings import Settings


def write_hindsight(
    folder: Path, log: DetectionLog, found: Hindsight, settings: Settings
) -> dict[str, Any]:
    """Write tracks.csv, tracks.parquet and links.csv; returns what run.json says of it."""
    rows, online = rows_in_hindsight(log, found, settings)
    with closing(TrackFiles(folder, TRACKS, log)) as files:
        files.add_with_online(rows, online)
    write_links(folder / "links.csv", found)
    return found.facts() | files.counts
