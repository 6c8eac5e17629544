"""Why an identity broke: every error of a run traced to one cause and one setting."""

from tracker.causes.again import with_ledger
from tracker.causes.diagnose import Diagnosis, diagnose
from tracker.causes.model import SETTING, Cause, Error, Finding
from tracker.causes.summary import summary_dict, summary_text, write_causes

__all__ = [
    "SETTING",
    "Cause",
    "Diagnosis",
    "Error",
    "Finding",
    "diagnose",
    "summary_dict",
    "summary_text",
    "with_ledger",
    "write_causes",
]
