"""Runs on disk and tracks in memory."""

from tracker.results.read import is_run, read_facts, read_run
from tracker.results.tracks import Tracks, TrackState

__all__ = ["TrackState", "Tracks", "is_run", "read_facts", "read_run"]
