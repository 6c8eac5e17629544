"""Which piece continues which: one exact assignment of ends to beginnings, in nats.

For each end there are two stories: the object is gone, or it is unseen and begins again as a
later piece. For each beginning: a new object, or the continuation of an earlier piece. With

    π   chance that an object whose track ends is still there (less where it is on its way out)
    h   mean time it stays unseen, so that it appears again after τ with density e^(−τ/h) / h
    λ   new tracks a second, as counted in the log
    E   evidence of the later piece's detections if they continue the earlier piece, by the state
        it predicts, and E₀ if they are a new object's, anywhere in view and of any size that new
        tracks have

the cost of a link is −ln(π e^(−τ/h) / h · E) + ln(λ E₀), and that of an end without one
−ln(1 − π + π e^(−T/h)), where T is what was left of the log. Each end has at most one
continuation and each beginning at most one origin, so the links form chains.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtr

from tracker.association.rule import gate_threshold
from tracker.errors import CertificateError, KernelError
from tracker.hindsight.beginnings import in_view, log_density_of_beginnings
from tracker.hindsight.ends import Ends, both_ends
from tracker.hindsight.pieces import Pieces, Scans
from tracker.hindsight.smoothing import Smoothable
from tracker.hindsight.stabilise import CommonFrame
from tracker.kernels.assignment import Problem, problem_frontier
from tracker.kernels.components import label_components
from tracker.kernels.grid import meeting_pairs
from tracker.kernels.link import LINK_OK, link_evidence
from tracker.kernels.margin import force_costs
from tracker.kernels.solve import Solution, solve
from tracker.log.model import DetectionLog, Floats, Ints
from tracker.settings import Settings

PROOF_TOLERANCE = 1e-9
WORTH_KEEPING = 7.0  # nats above the price of no link: more improbable candidates are not listed


@dataclass(frozen=True, slots=True, eq=False)
class Candidates:
    """(E,) pairs of an earlier and a later piece, sorted by both; gap in seconds, d², nats."""

    earlier: Ints
    later: Ints
    gap: Floats
    distance: Floats
    cost: Floats


@dataclass(frozen=True, slots=True, eq=False)
class Links:
    """Everything that was weighed, and what was decided.

    chosen : (E,) in the optimum.   own : (E,) both pieces are of one track of the engine.
    made : (E,) in the optimum with a large enough margin; or a joint of one track, where no other
    story is told with such a margin.
    margin : (E,) of chosen candidates, force : (E,) force cost of the others; nats.
    following : (P,) piece that continues each, -1 for none.
    """

    candidates: Candidates
    problem: Problem
    solution: Solution
    chosen: NDArray[np.bool_]
    own: NDArray[np.bool_]
    made: NDArray[np.bool_]
    margin: Floats
    force: Floats
    following: Ints


def link_pieces(
    pieces: Pieces,
    log: DetectionLog,
    scans: Scans,
    common: CommonFrame,
    model: Smoothable,
    settings: Settings,
    z: Floats,
    variance: Floats,
) -> Links:
    """Decide which pieces are one object.

    z, variance : (N, d) of the log in the common frame.

    Raises CertificateError if the assignment is not proved optimal.
    """
    ends = both_ends(model, pieces, scans, z, variance)
    miss, cost_of_end = _prices_of_ends(pieces, log, scans, common, model, settings, ends)
    found = _candidates(pieces, log, scans, model, settings, ends, miss, cost_of_end)
    start = np.searchsorted(found.earlier, np.arange(len(pieces) + 1))
    problem = Problem(start, found.later, found.cost, miss, np.zeros(len(pieces)))
    solution = solve(problem, True)
    if not max(abs(solution.gap), solution.violation) <= PROOF_TOLERANCE:
        raise CertificateError(
            "the links between tracks are not proved optimal",
            frame=int(scans.number[-1]),
            gap=solution.gap,
            violation=solution.violation,
        )
    components = label_components(problem.start, problem.column, len(problem.new))
    wanted = np.ones(len(components.candidates), np.bool_)
    answer = solution.answer
    force = force_costs(problem, components, answer, wanted, problem_frontier(problem))
    chosen = answer.row_candidate[found.earlier] == np.arange(len(found.earlier))
    margin = np.where(chosen, solution.row_margin[found.earlier], np.nan)
    own = pieces.identity[found.earlier] == pieces.identity[found.later]
    made = chosen & (margin >= settings.hindsight.link_margin)
    made |= _left_to_the_engine(found, own, made, solution, settings.hindsight.link_margin)
    following = np.full(len(pieces), -1, np.int64)
    following[found.earlier[made]] = found.later[made]
    force[chosen] = np.nan
    return Links(found, problem, solution, chosen, own, made, margin, force, following)


def _left_to_the_engine(
    found: Candidates,
    own: NDArray[np.bool_],
    made: NDArray[np.bool_],
    solution: Solution,
    limit: float,
) -> NDArray[np.bool_]:
    """(E,) joints of one track that were cut, where nothing is better without a doubt."""
    free_end = np.ones(len(solution.row_margin), np.bool_)
    free_start = np.ones(len(solution.column_margin), np.bool_)
    free_end[found.earlier[made]] = False
    free_start[found.later[made]] = False
    doubtful = np.minimum(solution.row_margin[found.earlier], solution.column_margin[found.later])
    # Pieces of one track follow each other.
    next_one = own & (found.later == found.earlier + 1)
    return next_one & free_end[found.earlier] & free_start[found.later] & (doubtful < limit)


def _prices_of_ends(
    pieces: Pieces,
    log: DetectionLog,
    scans: Scans,
    common: CommonFrame,
    model: Smoothable,
    settings: Settings,
    ends: Ends,
) -> tuple[Floats, Floats]:
    """(P,) what it costs to leave each end alone, and to say that it is an interruption."""
    how = settings.hindsight
    mean, covariance = ends.mean.copy(), ends.covariance.copy()
    model.predict(mean, covariance, how.hidden_seconds)
    d = model.dimension
    place, _, spread = common.back(mean[:, :d], mean[:, :d], covariance[:, :d, :d], pieces.last)
    low, high = in_view(log)
    sigma = np.sqrt(np.diagonal(spread, axis1=1, axis2=2)[:, :2])
    inside = np.prod(
        ndtr((high - place[:, :2]) / sigma) - ndtr((low - place[:, :2]) / sigma), axis=1
    )
    there = how.interruption_probability * np.clip(inside, 1e-9, 1.0)
    left = scans.time[-1] - scans.time[pieces.last]
    return -np.log1p(-there * -np.expm1(-left / how.hidden_seconds)), -np.log(there)


def _candidates(
    pieces: Pieces,
    log: DetectionLog,
    scans: Scans,
    model: Smoothable,
    settings: Settings,
    ends: Ends,
    miss: Floats,
    cost_of_end: Floats,
) -> Candidates:
    """Ends and beginnings that may belong together, found lag by lag: never all pairs."""
    how = settings.hindsight
    threshold = gate_threshold(how.gate_probability, model.dimension)
    new = log_density_of_beginnings(pieces, log, scans)
    alike = _Likeness(pieces, log, settings)
    parts: list[tuple[Ints, Ints, Floats, Floats, Floats]] = []
    last, first = pieces.last, pieces.first
    lag = 0
    while len(pieces) > 1:
        lag += 1
        row = np.flatnonzero(last + lag < len(scans.time))
        gap = scans.time[last[row] + lag] - scans.time[last[row]]
        row, gap = row[gap <= how.link_seconds], gap[gap <= how.link_seconds]
        if not len(row):
            break
        mean, covariance = _predicted(model, ends, row, gap)
        pair, later = _near(mean, covariance, last[row] + lag, ends, first, threshold)
        if not len(pair):
            continue
        evidence, distance = np.empty(len(pair)), np.empty(len(pair))
        status = link_evidence(
            mean[pair],
            covariance[pair],
            later,
            ends.origin,
            ends.information,
            ends.weighted,
            ends.spread,
            evidence,
            distance,
        )
        if status != LINK_OK:
            raise KernelError(
                f"the states of tracks {pieces.identity[row[pair[status]]]} and "
                f"{pieces.identity[later[status]]} are not positive definite"
            )
        earlier, gap = row[pair], gap[pair]
        cost = cost_of_end[earlier] + math.log(how.hidden_seconds) + gap / how.hidden_seconds
        cost += new[later] + ends.alone[later] - evidence + alike.cost(earlier, later)
        kept = (distance <= threshold) & (cost <= miss[earlier] + WORTH_KEEPING)
        parts.append((earlier[kept], later[kept], gap[kept], distance[kept], cost[kept]))
    if not parts:
        whole, real = np.empty(0, np.int64), np.empty(0)
        return Candidates(whole, whole, real, real, real)
    columns = [np.concatenate([part[k] for part in parts]) for k in range(5)]
    order = np.lexsort((columns[1], columns[0]))
    return Candidates(*(column[order] for column in columns))


def _start_variance(ends: Ends) -> Floats:
    return np.diagonal(ends.spread, axis1=1, axis2=2)


def _predicted(model: Smoothable, ends: Ends, row: Ints, gap: Floats) -> tuple[Floats, Floats]:
    """The states of some ends, each after its own gap."""
    mean, covariance = ends.mean[row], ends.covariance[row]
    steps, which = np.unique(gap, return_inverse=True)
    for k, step in enumerate(steps.tolist()):
        some = np.flatnonzero(which == k) if len(steps) > 1 else slice(None)
        part, spread = mean[some], covariance[some]
        model.predict(part, spread, step)
        mean[some], covariance[some] = part, spread
    return mean, covariance


def _near(
    mean: Floats, covariance: Floats, scan: Ints, ends: Ends, first: Ints, threshold: float
) -> tuple[Ints, Ints]:
    """Pairs (number of the prediction, piece) of the same scan whose gates can meet.

    Scans are laid side by side along the first axis, so that one search finds them all.
    """
    reach = np.sqrt(threshold * np.diagonal(covariance, axis1=1, axis2=2)[:, :2])
    own = np.sqrt(threshold * _start_variance(ends)[:, :2])
    origin = ends.origin[:, :2]
    low, high = (origin - own).min(axis=0), (origin + own).max(axis=0)
    begin = np.clip(mean[:, :2] - reach, low, high)
    end = np.clip(mean[:, :2] + reach, low, high)
    width = 2.0 * (high[0] - low[0]) + 1.0
    lane, other_lane = scan * width - low[0], first * width - low[0]
    begin[:, 0] += lane
    end[:, 0] += lane
    other_begin, other_end = origin - own, origin + own
    other_begin[:, 0] += other_lane
    other_end[:, 0] += other_lane
    start, later = meeting_pairs(begin, end, other_begin, other_end, np.iinfo(np.int64).max)
    return np.repeat(np.arange(len(mean)), np.diff(start)), later


class _Likeness:
    """Labels and embeddings of pieces as evidence, with the nats of [cost]."""

    def __init__(self, pieces: Pieces, log: DetectionLog, settings: Settings) -> None:
        self._label_nats = settings.cost.label
        self._appearance = settings.cost.appearance
        self._label = _commonest_labels(pieces, log)
        self._embedding: Floats | None = None
        if log.embedding is not None:
            vectors = log.embedding[pieces.row].astype(np.float64)
            length = np.linalg.norm(vectors, axis=1, keepdims=True)
            total = np.add.reduceat(vectors / np.maximum(length, 1e-12), pieces.start[:-1])
            length = np.linalg.norm(total, axis=1, keepdims=True)
            self._embedding = total / np.maximum(length, 1e-12)

    def cost(self, earlier: Ints, later: Ints) -> Floats:
        """(E,) nats against the pairs."""
        one, other = self._label[earlier], self._label[later]
        nats = np.where(one == other, -self._label_nats.agree_nats, self._label_nats.differ_nats)
        nats = np.where((one < 0) | (other < 0), 0.0, nats)
        if self._embedding is not None:
            cosine = np.einsum("ni,ni->n", self._embedding[earlier], self._embedding[later])
            nats = nats + self._appearance.nats * (self._appearance.neutral - cosine)
        return nats


def _commonest_labels(pieces: Pieces, log: DetectionLog) -> Ints:
    """(P,) code of each piece's commonest label, the lower of equals, -1 where none has one."""
    label = log.label[pieces.row].astype(np.int64)
    found = np.full(len(pieces), -1, np.int64)
    seen = np.flatnonzero(label >= 0)
    if len(seen):
        kinds = int(label.max()) + 1
        keys, counts = np.unique(
            pieces.of_detection[seen] * kinds + label[seen], return_counts=True
        )
        order = np.lexsort((-keys, counts))  # the commonest last, of equals the lower code
        found[keys[order] // kinds] = keys[order] % kinds
    return found
