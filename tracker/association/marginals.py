"""Joint probabilistic association: how probable each pair, miss and new detection is.

Probabilities are over all joint events of a frame, P ∝ exp(−cost) (Fortmann, Bar-Shalom and
Scheffe 1983). They are probabilities to the extent that costs are minus log-likelihood ratios:
with the *likelihood* cost and P_D, new_density and noise that were measured. Overlap and
mahalanobis costs give weights that order and sum like probabilities and are none.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from tracker.association.associate import TierDecision
from tracker.association.problem import checked_count, checked_problem
from tracker.kernels import marginals as kernel
from tracker.kernels.assignment import Problem
from tracker.kernels.components import label_components
from tracker.kernels.joint_update import Mixture
from tracker.kernels.marginals import Marginals
from tracker.kernels.solve import Solution, solve
from tracker.settings.schema import EXACT_LIMIT_MOST

__all__ = ["Marginals", "marginals", "mixture", "tier_marginals"]


def marginals(problem: Problem, *, exact_limit: int = 14, ranked: int = 100) -> Marginals:
    """Probability of every pair, miss and new detection of a problem.

    exact_limit : a component is summed exactly if no more columns (or rows) than this must be
    kept open at once when its rows (or columns) are taken in turn; never more than the smaller of
    their numbers, far fewer in sparse components.   ranked : larger components are summed over so
    many of their best events; `left_out` bounds the error that makes.

    Raises UsageError for a problem that is not one or a limit out of its range.

    Two tracks, one detection that fits both equally, and misses as cheap as pairs:

    >>> problem = Problem(
    ...     start=np.array([0, 1, 2]), column=np.array([0, 0]),
    ...     cost=np.zeros(2), miss=np.zeros(2), new=np.zeros(1),
    ... )
    >>> marginals(problem).pair  # first, second or neither: three events
    array([0.33333333, 0.33333333])
    """
    problem = checked_problem(problem)
    exact_limit = checked_count("exact_limit", exact_limit, EXACT_LIMIT_MOST)
    ranked = checked_count("ranked", ranked)
    return _solved(problem, solve(problem, False), exact_limit, ranked)


def tier_marginals(tier: TierDecision, exact_limit: int, ranked: int) -> Marginals:
    """The same for what a tier of the engine decided on."""
    return _solved(tier.problem, tier.solution, exact_limit, ranked)


def _solved(problem: Problem, solution: Solution, exact_limit: int, ranked: int) -> Marginals:
    answer = solution.answer
    components = label_components(problem.start, problem.column, len(problem.new))
    return kernel.marginals(
        problem, components, answer.row_price, answer.column_price, exact_limit, ranked
    )


def mixture(tiers: Sequence[TierDecision], shares: Sequence[Marginals], tracks: int) -> Mixture:
    """What may have corrected each of the live tracks.

    A later tier divides what an earlier one left to a track's miss. A track that an earlier tier
    paired, or a detection that it used, does not take part in later ones, as in `associate`.
    """
    first = tiers[0]
    if len(tiers) == 1 and first.selected_tracks is None and first.selected_detections is None:
        return Mixture(first.problem.start, first.problem.column, shares[0].pair)
    left = np.ones(tracks)
    rows, detections, weights = [], [], []
    for tier, share in zip(tiers, shares, strict=True):
        row = np.repeat(tier.track, np.diff(tier.problem.start))
        rows.append(row)
        detections.append(tier.detection[tier.problem.column])
        weights.append(share.pair * left[row])
        left[tier.track] *= share.miss
    row = np.concatenate(rows)
    order = np.argsort(row, kind="stable")
    start = np.concatenate(([0], np.cumsum(np.bincount(row, minlength=tracks))))
    return Mixture(
        start.astype(np.int64),
        np.concatenate(detections)[order],
        np.concatenate(weights)[order],
    )
