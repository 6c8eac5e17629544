"""Margent: multi-object tracking association with a proof, a margin and a reason.

>>> from tracker import Engine, Settings, read_log, evaluate
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from tracker.association import CandidatePairs, k_best, marginals, register_cost
    from tracker.calibration import Calibration, calibrate
    from tracker.causes import diagnose
    from tracker.comparison import compare
    from tracker.diagnosis import explain
    from tracker.engine import Engine, FrameResult
    from tracker.errors import MargentError
    from tracker.evaluation import evaluate
    from tracker.log import DetectionLog, Frame, Kind, Truth, read_log, read_truth
    from tracker.offline import associate_log, track_log
    from tracker.report import write_page
    from tracker.results import Tracks, TrackState, read_run
    from tracker.settings import Settings, load_settings

# Where each public name lives. They are imported on first use (PEP 562), so that
# `margent --help` does not wait for numba.
_HOME = {
    "Calibration": "tracker.calibration",
    "CandidatePairs": "tracker.association",
    "DetectionLog": "tracker.log",
    "Engine": "tracker.engine",
    "Frame": "tracker.log",
    "FrameResult": "tracker.engine",
    "Kind": "tracker.log",
    "MargentError": "tracker.errors",
    "Settings": "tracker.settings",
    "TrackState": "tracker.results",
    "Tracks": "tracker.results",
    "Truth": "tracker.log",
    "associate_log": "tracker.offline",
    "calibrate": "tracker.calibration",
    "compare": "tracker.comparison",
    "diagnose": "tracker.causes",
    "evaluate": "tracker.evaluation",
    "explain": "tracker.diagnosis",
    "k_best": "tracker.association",
    "load_settings": "tracker.settings",
    "marginals": "tracker.association",
    "read_log": "tracker.log",
    "read_run": "tracker.results",
    "read_truth": "tracker.log",
    "register_cost": "tracker.association",
    "track_log": "tracker.offline",
    "write_page": "tracker.report",
}

__all__ = [
    "Calibration",
    "CandidatePairs",
    "DetectionLog",
    "Engine",
    "Frame",
    "FrameResult",
    "Kind",
    "MargentError",
    "Settings",
    "TrackState",
    "Tracks",
    "Truth",
    "associate_log",
    "calibrate",
    "compare",
    "diagnose",
    "evaluate",
    "explain",
    "k_best",
    "load_settings",
    "marginals",
    "read_log",
    "read_run",
    "read_truth",
    "register_cost",
    "track_log",
    "write_page",
]


def __getattr__(name: str) -> Any:
    if name not in _HOME:
        raise AttributeError(f"module 'tracker' has no attribute {name!r}")
    value = getattr(import_module(_HOME[name]), name)
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    return sorted(__all__)
