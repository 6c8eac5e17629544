"""What do exact and ranked joint probabilities cost, and how good are the ranked ones?

Components of growing ambiguity from gated scenes, both ways in turn on the same component, and
the whole engine in both modes. Prints ratios; a component that is too wide for the exact sum is
printed too, without one.

    python scripts/benchmark_joint.py --ranked 100
"""

from __future__ import annotations

import argparse
import time
from collections.abc import Callable
from typing import Any

import numpy as np
from benchmark_engine import scene

from tracker import Engine
from tracker.kernels.assignment import Problem
from tracker.kernels.components import label_components
from tracker.kernels.elimination import exact_marginals
from tracker.kernels.marginals import ranked_marginals
from tracker.kernels.part import event_weights, part_of
from tracker.kernels.solve import solve
from tracker.settings import settings_from
from tracker.settings.schema import EXACT_LIMIT_MOST


def component(tracks: int, spacing: float, seed: int) -> Problem:
    """Largest component of tracks a few innovation sigmas apart, gated, a tenth missed."""
    rng = np.random.default_rng(seed)
    side = spacing * np.sqrt(tracks)
    track = rng.uniform(0, side, (tracks, 2))
    z = track + rng.normal(0, 1, (tracks, 2))
    z = np.vstack((z[rng.random(tracks) < 0.9], rng.uniform(0, side, (tracks // 10, 2))))
    d2 = ((track[:, None] - z[None]) ** 2).sum(axis=2)
    allowed = d2 < 13.8  # chi-square of two dimensions at 0.999
    cost = 0.5 * d2 + np.log(2 * np.pi) - np.log(0.9) + np.log(0.1 / spacing**2)
    start = np.concatenate(([0], np.cumsum(allowed.sum(axis=1))))
    column = np.nonzero(allowed)[1]
    whole = Problem(start, column, cost[allowed], np.full(tracks, 2.3), np.zeros(len(z)))
    components = label_components(start, column, len(z))
    largest = np.argmax(components.candidates)
    rows = np.flatnonzero(components.of_row == largest)
    return part_of(whole, rows, np.flatnonzero(components.of_column == largest))[0]


def seconds(call: Callable[..., Any], *arguments: Any) -> tuple[float, Any]:
    """Best of five runs, and the result."""
    best = np.inf
    for _ in range(5):
        start = time.perf_counter()
        result = call(*arguments)
        best = min(best, time.perf_counter() - start)
    return best, result


def components_table(ranked: int) -> None:
    print(
        f"against one assignment of the same component; ranked: {ranked} best, bound of the error"
    )
    print(" rows columns pairs open   exact×  ranked×  largest error    bound")
    for tracks, spacing in ((10, 4), (20, 4), (50, 4), (20, 3), (50, 3), (20, 2), (50, 2)):
        problem = component(tracks, spacing, seed=tracks)
        unit, solution = seconds(solve, problem, False)
        prices = solution.answer.row_price, solution.answer.column_price
        weights = event_weights(problem, *prices)
        exact, (width, *truth) = seconds(exact_marginals, weights, EXACT_LIMIT_MOST)
        some, (bound, *found) = seconds(ranked_marginals, problem, ranked)
        error = max(np.abs(a - b).max() for a, b in zip(found, truth, strict=True))
        too_wide = width > EXACT_LIMIT_MOST
        print(
            f"{len(problem.miss):5d} {len(problem.new):7d} {len(problem.column):5d} "
            f"{'>' if too_wide else ' '}{min(width, EXACT_LIMIT_MOST):3d} "
            f"{'-' if too_wide else format(exact / unit, '.0f'):>8} {some / unit:8.0f} "
            f"{'-' if too_wide else format(error, '.2g'):>14} {bound:8.2g}"
        )


def engine_table() -> None:
    print("engine step, joint-probabilistic over best")
    for objects in (1, 20, 100, 1000):
        log = scene(objects, 60)
        medians = []
        for mode in ("best", "joint-probabilistic"):
            engine = Engine(settings_from({"association": {"mode": mode}}))
            taken = [seconds_of_step(engine, frame) for frame in log]
            medians.append(np.median(taken[20:]))
        print(f"{objects:8d} objects: {medians[1] / medians[0]:.1f}×")


def seconds_of_step(engine: Engine, frame: Any) -> float:
    start = time.perf_counter()
    engine.step(frame)
    return time.perf_counter() - start


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--ranked", type=int, default=100)
    components_table(parser.parse_args().ranked)
    engine_table()


if __name__ == "__main__":
    main()
