"""Once a log is over: identities decided anew, smoothed and without gaps."""

from tracker.hindsight.look_back import Hindsight, check_hindsight, look_back, rows_in_hindsight
from tracker.hindsight.pieces import Collector
from tracker.hindsight.write import write_hindsight

__all__ = [
    "Collector",
    "Hindsight",
    "check_hindsight",
    "look_back",
    "rows_in_hindsight",
    "write_hindsight",
]
