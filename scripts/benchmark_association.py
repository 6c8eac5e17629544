"""What association costs: proof and margins, against scipy's dense solver, and as scenes grow.

Gate, costs and assignment of one frame of points at constant density, each with about one
candidate of its own and now and then a neighbour's. All ratios are of medians taken in turn in
this run.

    python scripts/benchmark_association.py
"""

from __future__ import annotations

import argparse
import platform
import time
from collections.abc import Callable
from functools import partial
from importlib.metadata import version

import numpy as np
from numba import njit
from scipy.optimize import linear_sum_assignment

from tracker.kernels.assignment import Assignment, Problem, assign, problem_frontier
from tracker.kernels.components import label_components
from tracker.kernels.cost import mahalanobis_term
from tracker.kernels.gate import gate_candidates
from tracker.kernels.solve import solve

GATE = 13.8  # d² at 0.999, two components
MISS = 2.3


def scene(objects: int, seed: int = 1) -> tuple[np.ndarray, ...]:
    """Tracks and detections at one object per 25 square metres, a tenth undetected, clutter."""
    rng = np.random.default_rng(seed)
    side = 5.0 * np.sqrt(objects)
    mean = np.concatenate((rng.uniform(0, side, (objects, 2)), np.zeros((objects, 2))), axis=1)
    covariance = np.tile(np.diag([0.3, 0.3, 1.0, 1.0]), (objects, 1, 1))
    seen = rng.random(objects) < 0.9
    z = np.concatenate(
        (
            mean[seen, :2] + rng.normal(0, 0.6, (seen.sum(), 2)),
            rng.uniform(0, side, (objects // 10, 2)),
        )
    )
    return mean, covariance, z, np.full(z.shape, 0.1)


def gated(arrays: tuple[np.ndarray, ...]) -> Problem:
    """The frame's problem: gate and costs."""
    _, _, candidates = gate_candidates(*arrays, GATE, 0.0, False, False, 10**9)
    cost = mahalanobis_term(candidates.distance, GATE) + 0.1
    miss, new = np.full(len(arrays[0]), MISS), np.zeros(len(arrays[2]))
    return Problem(candidates.start, candidates.column, cost, miss, new)


@njit
def assign_only(problem: Problem) -> Assignment:
    """Components and assignment, compiled into one call as `solve` is."""
    components = label_components(problem.start, problem.column, len(problem.new))
    return assign(problem, components, problem_frontier(problem))


def plain(arrays: tuple[np.ndarray, ...]) -> None:
    """Gate, cost and assignment."""
    assign_only(gated(arrays))


def proved(arrays: tuple[np.ndarray, ...]) -> None:
    """The same with the proof."""
    solve(gated(arrays), False)


def explained(arrays: tuple[np.ndarray, ...]) -> None:
    """The same with the proof and all margins: what the engine does."""
    solve(gated(arrays), True)


def dense(arrays: tuple[np.ndarray, ...]) -> None:
    """The same by a dense matrix and scipy: distances, gate, misses as a bound on the cost."""
    mean, covariance, z, variance = arrays
    inverse = 1.0 / (covariance[0, 0, 0] + variance[0, 0])
    apart = mean[:, None, :2] - z[None]
    distance = (apart**2).sum(axis=2) * inverse
    linear_sum_assignment(np.minimum(0.5 * (distance - GATE), MISS))


def in_turn(calls: list[Callable[[], None]], rounds: int) -> list[float]:
    """Median seconds of each call, the calls taking turns."""
    seconds = np.empty((rounds, len(calls)))
    for k in range(rounds):
        for c, call in enumerate(calls):
            start = time.perf_counter()
            call()
            seconds[k, c] = time.perf_counter() - start
    return [float(value) for value in np.median(seconds, axis=0)]


def show_cost_of_proof(sizes: list[int]) -> None:
    """Proof and margins on top of gate, cost and assignment."""
    print("proof and margins on top of gate + cost + assignment")
    print(f"{'objects':>8} {'without':>10} {'proof':>8} {'both':>8}")
    for objects in sizes:
        arrays = scene(objects)
        without, proof, both = in_turn(
            [partial(call, arrays) for call in (plain, proved, explained)],
            400 if objects < 500 else 60,
        )
        proof, both = proof / without - 1, both / without - 1
        print(f"{objects:8d} {1e6 * without:8.0f}us {proof:+8.0%} {both:+8.0%}")


def show_growth(sizes: list[int]) -> None:
    """Microseconds an object at constant density, with the proof."""
    print("gate + cost + assignment + proof at constant density")
    print(f"{'objects':>8} {'us/object':>10} {'against smallest':>17}")
    first = 0.0
    for objects in sizes:
        arrays = scene(objects)
        (seconds,) = in_turn([partial(proved, arrays)], 200 if objects < 500 else 15)
        each = 1e6 * seconds / objects
        first = first or each
        print(f"{objects:8d} {each:10.3f} {each / first:17.2f}")


def show_dense(objects: int) -> None:
    """Against a dense matrix solved by scipy."""
    arrays = scene(objects)
    ours, theirs = in_turn([partial(proved, arrays), partial(dense, arrays)], 5)
    print(f"against scipy's dense solver at {objects} objects: {theirs / ours:.0f} times faster")
    small = scene(3)
    ours, theirs = in_turn([partial(proved, small), partial(dense, small)], 500)
    print(f"                           at 3 objects: {theirs / ours:.1f} times")


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--dense", type=int, default=5000, help="objects of the dense comparison")
    options = parser.parse_args()
    packages = ", ".join(f"{name} {version(name)}" for name in ("numpy", "numba", "scipy"))
    print(f"{platform.machine()}, Python {platform.python_version()}, {packages}")
    for call in (plain, proved, explained):
        call(scene(300))  # compile
    show_cost_of_proof([20, 100, 2000])
    show_growth([50, 500, 5000, 50_000])
    show_dense(options.dense)


if __name__ == "__main__":
    main()
