"""The cost terms by name: those built in, and functions that users register.

To add a built-in term: a kernel in kernels/cost.py with its twin, a function here, its settings in
settings/schema.py.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from tracker.association.pairs import CandidatePairs
from tracker.errors import UsageError
from tracker.kernels.cost import (
    appearance_term,
    label_term,
    likelihood_term,
    mahalanobis_term,
    overlap_term,
)
from tracker.kernels.overlap import generalised_overlap
from tracker.log.model import Floats
from tracker.settings.schema import CostSettings

CostFunction = Callable[[CandidatePairs], Floats]

TERMS = ("overlap", "generalised-overlap", "mahalanobis", "likelihood", "label", "appearance")

_registered: dict[str, CostFunction] = {}


def register_cost(name: str, function: CostFunction) -> None:
    """Make a function available as a cost term.

    function : takes `CandidatePairs`, returns (E,) finite nats: minus the log-likelihood ratio of
    'same object' against 'new object'. It must be deterministic. Registering a name again replaces
    the function; the built-in names cannot be taken.

    Raises UsageError for a name that is built in.
    """
    if name in TERMS or name == "auto":
        raise UsageError(f"'{name}' is a built-in cost term; choose another name")
    _registered[name] = function


def registered_costs() -> dict[str, CostFunction]:
    """The registered functions by name."""
    return dict(_registered)


def known_terms() -> list[str]:
    """All names that ``cost.terms`` may hold."""
    return ["auto", *TERMS, *sorted(_registered)]


def evaluate_term(
    name: str,
    pairs: CandidatePairs,
    cost: CostSettings,
    threshold: float,
    boxes: bool,
    log_new_density: float,
) -> Floats:
    """(E,) nats of one term.

    Raises UsageError for a registered function that does not return E finite numbers.
    """
    if name == "overlap":
        return overlap_term(pairs.overlap, cost.overlap.nats, cost.overlap.neutral)
    if name == "mahalanobis":
        return mahalanobis_term(pairs.distance, threshold)
    if name == "likelihood":
        return likelihood_term(
            pairs.distance, pairs.log_volume, pairs.seen, pairs.detection, boxes, log_new_density
        )
    if name == "generalised-overlap":
        settings = cost.generalised_overlap
        overlap = generalised_overlap(pairs.track_state, pairs.measurement)
        return overlap_term(overlap, settings.nats, settings.neutral)
    if name == "label":
        return label_term(
            pairs.track_label, pairs.detection_label, cost.label.agree_nats, cost.label.differ_nats
        )
    if name == "appearance":
        return _appearance(pairs, cost)
    return _checked(name, _registered[name](pairs), len(pairs))


def _appearance(pairs: CandidatePairs, cost: CostSettings) -> Floats:
    embeddings = pairs.detection_embeddings
    assert embeddings is not None, "the engine sees to that"
    return appearance_term(
        pairs.track_embeddings,
        pairs.row,
        embeddings,
        pairs.detection,
        cost.appearance.nats,
        cost.appearance.neutral,
    )


def _checked(name: str, values: Floats, count: int) -> Floats:
    values = np.asarray(values, np.float64)
    if values.shape != (count,) or not np.isfinite(values).all():
        raise UsageError(
            f"the cost function '{name}' must return {count} finite numbers, one a pair; it "
            f"returned an array of shape {values.shape}"
            + ("" if values.shape != (count,) else " with values that are not finite")
        )
    return values
