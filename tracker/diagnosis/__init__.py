"""Why the tracks came out as they did, read from a run's ledger."""

from tracker.diagnosis.explain import explain
from tracker.diagnosis.explanation import Explanation

__all__ = ["Explanation", "explain"]
