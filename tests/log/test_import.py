"""Importing the package must be cheap: heavy libraries are imported where they are used."""

from __future__ import annotations

import subprocess
import sys

import tracker.log


def test_import_brings_no_heavy_library():
    code = (
        "import sys, tracker.log; "
        "print([m for m in ('numba', 'pandas', 'pyarrow', 'scipy', 'cv2') if m in sys.modules])"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"


def test_public_names():
    assert sorted(tracker.log.__all__) == [
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
    assert all(hasattr(tracker.log, name) for name in tracker.log.__all__)
