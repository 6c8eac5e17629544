"""Is one run better than another, and where?"""

from tracker.comparison.bootstrap import Resampling
from tracker.comparison.changed_settings import ChangedSetting, changed_settings, changed_sources
from tracker.comparison.compare import compare
from tracker.comparison.model import COMPARED, LOWER_BETTER, Change, Comparison
from tracker.comparison.objects import ObjectChange, worst_first, write_objects
from tracker.comparison.parting import Difference, Parting
from tracker.comparison.tolerance import Judgement, Tolerance, judge, parse_tolerance

__all__ = [
    "COMPARED",
    "LOWER_BETTER",
    "Change",
    "ChangedSetting",
    "Comparison",
    "Difference",
    "Judgement",
    "ObjectChange",
    "Parting",
    "Resampling",
    "Tolerance",
    "changed_settings",
    "changed_sources",
    "compare",
    "judge",
    "parse_tolerance",
    "worst_first",
    "write_objects",
]
