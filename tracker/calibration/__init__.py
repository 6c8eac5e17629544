"""Settings measured from detections and truth."""

from tracker.calibration.calibrate import Calibration, calibrate

__all__ = ["Calibration", "calibrate"]
