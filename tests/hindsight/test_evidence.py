"""What weighs for and against a link, one thing at a time."""

import numpy as np
import pytest
from scipy.stats import chi2, multivariate_normal

from tests.hindsight.scenes import collected, crossing, log_of, settings
from tracker.hindsight.beginnings import log_density_of_beginnings
from tracker.hindsight.cutting import cut_in_doubt
from tracker.hindsight.look_back import look_back, rows_in_hindsight
from tracker.hindsight.pieces import Pieces, Scans
from tracker.log.model import Kind


def links(*overrides):
    frame, z, _ = crossing()
    log = log_of(frame, z)
    chosen = settings("hindsight.cut_margin=0", *overrides)
    collector, born = collected(log, chosen)
    return look_back(log, collector, chosen, born).links


def costs(found):
    weighed = found.candidates
    return {
        (i, j): (cost, found.problem.miss[i], gap)
        for i, j, cost, gap in zip(
            weighed.earlier.tolist(),
            weighed.later.tolist(),
            weighed.cost.tolist(),
            weighed.gap.tolist(),
            strict=True,
        )
    }


def test_the_chance_of_an_interruption_enters_as_odds():
    """Ends far inside the view: the link costs -ln(pi), to end costs -ln(1 - pi)."""
    even, rare = costs(links()), costs(links("hindsight.interruption_probability=0.1"))
    both = even.keys() & rare.keys()
    assert len(both) >= 12
    inside = 0
    for pair in both:
        dearer = rare[pair][0] - even[pair][0]
        assert dearer == pytest.approx(np.log(5.0), abs=1e-9)
        inside += abs(even[pair][1] - rare[pair][1] - np.log(0.9 / 0.5)) < 0.02
    assert inside >= 6


def test_the_time_unseen_enters_as_an_exponential():
    short, long = costs(links()), costs(links("hindsight.hidden_seconds=3"))
    both = short.keys() & long.keys()
    assert len(both) >= 12
    for pair in both:
        gap = short[pair][2]
        change = long[pair][0] - short[pair][0]
        expected = np.log(3.0) + gap / 3.0 - gap
        # What is left is the chance to be out of view by then, which grows with the time.
        assert expected - 1e-9 <= change < expected + 2.5


def test_the_gate_bounds_the_distance():
    wide = links()
    limit = float(np.median(wide.candidates.distance))
    narrow = links(f"hindsight.gate_probability={chi2.cdf(limit, 2)}")
    kept = wide.candidates.distance <= limit
    assert 0 < kept.sum() < len(kept)
    assert narrow.candidates.distance.max() <= limit + 1e-9
    assert len(narrow.candidates.cost) == kept.sum()
    assert wide.candidates.distance.max() <= chi2.ppf(0.9999, 2)


@pytest.mark.parametrize("kind", [Kind.POINT, Kind.BOX])
def test_the_density_of_beginnings_is_a_kernel_estimate_of_the_others(kind):
    """Against scipy's normals in plain loops; Silverman 1986, section 4.3 (from memory)."""
    rng = np.random.default_rng(3)
    count = 25
    z = rng.uniform(0, 100, (count, 2))
    if kind is Kind.BOX:
        z = np.column_stack((z, np.exp(rng.normal(3, 0.5, (count, 2)))))
    whole = np.arange(count)
    log = log_of(np.arange(count) + 1, z, kind)
    scans = Scans(whole + 1, 0.5 * whole)
    pieces = Pieces(np.arange(count + 1), whole + 1, whole, whole, whole + 1, np.zeros(count))
    found = log_density_of_beginnings(pieces, log, scans)
    extent = np.ptp(z[:, :2], axis=0)
    place = (z[:, :2] - z[:, :2].min(axis=0)) / extent
    level = np.prod(extent)
    if kind is Kind.BOX:
        place = np.column_stack((place, np.log(z[:, 2:])))
    k = place.shape[1]
    spread = np.cov(place.T) + 0.01 * np.eye(k)
    width = (4.0 / ((k + 2) * count)) ** (1.0 / (k + 4))
    rate = (count - 1) / (scans.time[-1] - scans.time[0])
    for i in range(count):
        total = multivariate_normal(place.mean(axis=0), spread).pdf(place[i])
        for j in range(count):
            if i != j:
                total += multivariate_normal(place[j], width**2 * spread).pdf(place[i])
        density = rate * total / (count + 1) / level
        if kind is Kind.BOX:
            density /= z[i, 2] * z[i, 3]  # of sizes, not of their logarithms
        assert found[i] == pytest.approx(np.log(density), rel=1e-9)


def test_scans_that_are_far_apart_are_no_gaps():
    scan = np.array([0, 1, 2, 4, 5])
    pieces = Pieces(
        np.array([0, 5]), np.array([1]), scan, np.arange(5), np.ones(5, int), np.zeros(5)
    )
    slow = Scans(np.arange(1, 7), 2.0 * np.arange(6))
    cut = cut_in_doubt(pieces, slow, 0.5, 0.2)
    assert cut.start.tolist() == [0, 3, 5]  # one scan was missed, and only that is a gap
    assert cut.identity.tolist() == [1, 1]
    assert len(cut_in_doubt(pieces, slow, 4.0, 0.2)) == 1


def test_a_decision_with_a_small_margin_is_cut():
    scan = np.array([0, 1, 2, 3, 4])
    margin = np.array([9.0, 0.1, 9.0, 0.3])
    confidence = np.concatenate(([0.0], np.cumsum(-np.log1p(np.exp(-margin)))))
    pieces = Pieces(
        np.array([0, 5]), np.array([1]), scan, np.arange(5), np.ones(5, int), confidence
    )
    scans = Scans(scan + 1, 0.9 * scan)
    assert cut_in_doubt(pieces, scans, 0.5, 0.2).start.tolist() == [0, 2, 5]
    assert cut_in_doubt(pieces, scans, 0.5, 0.4).start.tolist() == [0, 2, 4, 5]
    assert cut_in_doubt(pieces, scans, 0.5, 0.0).start.tolist() == [0, 5]
    # Closer together than a second, only the closest call is cut.
    fast = Scans(scan + 1, 0.4 * scan)
    assert cut_in_doubt(pieces, fast, 0.5, 0.4).start.tolist() == [0, 2, 5]


def test_tracks_that_nothing_is_done_to_keep_their_confidence():
    frame, z, _ = crossing(hidden=())
    log = log_of(frame, z + np.where(frame[:, None] % 7 == 0, 0.5, 0.0))
    chosen = settings("hindsight.cut_margin=0")
    collector, born = collected(log, chosen)
    _, tracks = collector.finish()
    found = look_back(log, collector, chosen, born)
    rows, _ = rows_in_hindsight(log, found, chosen)
    own = {
        (int(t), int(s)): c
        for t, s, c in zip(tracks.online, tracks.scan, tracks.log_confidence, strict=True)
    }
    assert min(own.values()) < -1e-6
    for track, number, confidence in zip(rows.track, rows.frame, rows.confidence, strict=True):
        assert np.log(confidence) == pytest.approx(own[int(track), int(number) - 1], abs=1e-12)
