"""Scores against truth."""

from tracker.evaluation.evaluate import Evaluation, evaluate, evaluate_all
from tracker.evaluation.scope import Scope
from tracker.evaluation.scores import Counts, Scores

__all__ = ["Counts", "Evaluation", "Scope", "Scores", "evaluate", "evaluate_all"]
