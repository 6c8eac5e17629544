"""Scores against truth."""

from tracker.evaluation.evaluate import Evaluation, evaluate, evaluate_all, evaluate_classes
from tracker.evaluation.regions import read_regions
from tracker.evaluation.scope import Scope
from tracker.evaluation.scores import Counts, Scores
from tracker.evaluation.self_check import is_perfect, self_check

__all__ = [
    "Counts",
    "Evaluation",
    "Scope",
    "Scores",
    "evaluate",
    "evaluate_all",
    "evaluate_classes",
    "is_perfect",
    "read_regions",
    "self_check",
]
