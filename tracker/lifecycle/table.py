"""The live tracks as a struct of arrays, always in order of track id."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from tracker.log.model import Codes, Floats, Ints
from tracker.results.tracks import TrackState


class TrackTable:
    """Live tracks; row i of every array is one track, ids increase with i and are never reused.

    The public arrays are views of exactly the live rows. They are replaced by `append` and
    `keep`, so take them afresh after those; writing into them changes the table.
    """

    identity: Ints  # (n,) track id, from 1
    state: NDArray[np.int8]  # (n,) TrackState
    hits: Ints  # (n,) detections since birth
    age: Ints  # (n,) frames since birth, the birth included
    last_seen: Floats  # (n,) seconds, time of the last detection
    score: Floats  # (n,) score of the last detection
    label: Codes  # (n,) label of the first detection that had one
    log_confidence: Floats  # (n,) natural log of the identity confidence
    evidence: Floats  # (n,) log-odds that there is an object, nats; 0 where hits decide
    mean: Floats  # (n, s)
    covariance: Floats  # (n, s, s)
    embedding: NDArray[np.float32]  # (n, k) running mean, k = 0 if appearance is not used

    _NAMES = (
        "identity",
        "state",
        "hits",
        "age",
        "last_seen",
        "score",
        "label",
        "log_confidence",
        "evidence",
        "mean",
        "covariance",
        "embedding",
    )

    def __init__(self, states: int) -> None:
        self._next_identity = 1
        self._count = 0
        self._store: dict[str, NDArray] = {
            "identity": np.empty(0, np.int64),
            "state": np.empty(0, np.int8),
            "hits": np.empty(0, np.int64),
            "age": np.empty(0, np.int64),
            "last_seen": np.empty(0),
            "score": np.empty(0),
            "label": np.empty(0, np.int32),
            "log_confidence": np.empty(0),
            "evidence": np.empty(0),
            "mean": np.empty((0, states)),
            "covariance": np.empty((0, states, states)),
            "embedding": np.empty((0, 0), np.float32),
        }
        self._refresh()

    def __len__(self) -> int:
        return self._count

    @property
    def born(self) -> int:
        """How many tracks there have been."""
        return self._next_identity - 1

    def hold_embeddings(self, length: int) -> None:
        """Make room for embeddings of that length; zero, which says nothing, until one is seen."""
        self._store["embedding"] = np.zeros((len(self._store["identity"]), length), np.float32)
        self._refresh()

    def append(
        self,
        mean: Floats,
        covariance: Floats,
        score: Floats,
        label: Codes,
        now: float,
        evidence: float = 0.0,
    ) -> Ints:
        """Add tentative tracks; returns their new ids."""
        first, last = self._count, self._count + len(mean)
        if last > len(self._store["identity"]):
            self._grow(max(last, 2 * first, 16))
        identity = np.arange(self._next_identity, self._next_identity + len(mean))
        values = {
            "identity": identity,
            "state": TrackState.TENTATIVE,
            "hits": 1,
            "age": 1,
            "last_seen": now,
            "score": score,
            "label": label,
            "log_confidence": 0.0,
            "evidence": evidence,
            "mean": mean,
            "covariance": covariance,
            "embedding": 0.0,
        }
        for name, value in values.items():
            self._store[name][first:last] = value
        self._next_identity += len(mean)
        self._count = last
        self._refresh()
        return identity

    def keep(self, wanted: NDArray[np.bool_]) -> None:
        """Drop the rows that are not wanted; the order of the rest stays."""
        first = int(np.argmin(wanted))
        if wanted[first]:
            return
        left = wanted[first:]
        last = first + int(np.count_nonzero(left))
        for store in self._store.values():
            store[first:last] = store[first : self._count][left]
        self._count = last
        self._refresh()

    def _grow(self, capacity: int) -> None:
        for name, store in self._store.items():
            larger = np.empty((capacity, *store.shape[1:]), store.dtype)
            larger[: self._count] = store[: self._count]
            self._store[name] = larger

    def _refresh(self) -> None:
        for name in self._NAMES:
            setattr(self, name, self._store[name][: self._count])
