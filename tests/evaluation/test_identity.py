"""The global matching of the identity metrics, against scipy's dense solver."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.optimize import linear_sum_assignment

from tracker.evaluation.couples import Couples
from tracker.evaluation.identity import own_tracks


@pytest.mark.parametrize("seed", range(30))
def test_against_scipy(seed):
    rng = np.random.default_rng(seed)
    objects, tracks = rng.integers(1, 30, 2)
    shared = rng.integers(1, 9, (objects, tracks)) * (rng.random((objects, tracks)) < 0.3)
    thing, track = np.nonzero(rng.random((objects, tracks)) < 0.8)  # some couples share nothing
    shared = np.where(np.isin(np.arange(objects * tracks).reshape(objects, tracks),
                              thing * tracks + track), shared, 0)  # fmt: skip
    nothing = np.zeros(0, np.int64)
    couples = Couples(nothing, thing, track, nothing, nothing)
    own, total = own_tracks(couples, shared[thing, track], int(objects))
    rows, columns = linear_sum_assignment(shared, maximize=True)
    assert total == shared[rows, columns].sum()
    given = own[own >= 0]
    assert len(set(given.tolist())) == len(given)
    assert total == shared[np.flatnonzero(own >= 0), given].sum()


def test_a_longer_track_elsewhere_may_be_better_for_all():
    # Object 0 shares 5 rows with track 0 and 4 with track 1, object 1 shares 4 with track 0 alone.
    nothing = np.zeros(0, np.int64)
    couples = Couples(nothing, np.array([0, 0, 1]), np.array([0, 1, 0]), nothing, nothing)
    own, total = own_tracks(couples, np.array([5, 4, 4]), 2)
    assert (own.tolist(), total) == ([1, 0], 8)


def test_no_couples():
    nothing = np.zeros(0, np.int64)
    couples = Couples(nothing, nothing, nothing, nothing, nothing)
    own, total = own_tracks(couples, nothing, 3)
    assert (own.tolist(), total) == ([-1, -1, -1], 0)
