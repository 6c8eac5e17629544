"""Detection logs, truth and track files: read, check, summarise.

log = read_log("detections.csv")
truth = read_truth("truth.csv")
"""

from tracker.log.columns import parse_columns
from tracker.log.detections import read_log
from tracker.log.model import (
    DetectionLog,
    Frame,
    Kind,
    Rejection,
    SequenceFacts,
    Truth,
    box_centre,
    box_corner,
)
from tracker.log.summary import LogSummary, inspect_log
from tracker.log.summary_text import summary_text
from tracker.log.track_file import read_track_file
from tracker.log.truth import read_truth

__all__ = [
    "DetectionLog",
    "Frame",
    "Kind",
    "LogSummary",
    "Rejection",
    "SequenceFacts",
    "Truth",
    "box_centre",
    "box_corner",
    "inspect_log",
    "parse_columns",
    "read_log",
    "read_track_file",
    "read_truth",
    "summary_text",
]
