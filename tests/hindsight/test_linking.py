"""Links: planted gaps, impossible gaps, exact margins, evidence by running the filter."""

from itertools import product

import numpy as np
import pytest
from msgspec.structs import replace
from scipy.stats import multivariate_normal

from tests.hindsight.scenes import SIGMA, collected, crossing, log_of, settings, walk
from tests.reference.kalman import process_noise, transition
from tracker.hindsight.cutting import cut_in_doubt
from tracker.hindsight.ends import both_ends
from tracker.hindsight.look_back import look_back, rows_in_hindsight
from tracker.kernels.link import link_evidence
from tracker.log.model import Kind
from tracker.motion import motion_model
from tracker.results.tracks import TrackState


def hindsight(log, *overrides):
    chosen = settings(*overrides)
    collector, born = collected(log, chosen)
    return look_back(log, collector, chosen, born)


def owners(found, log, owner):
    """For each object in hindsight, the true objects of its detections."""
    true = owner[log.line - 1]
    chains = found.chains
    return [
        set(true[chains.row[chains.start[k] : chains.start[k + 1]]].tolist())
        for k in range(len(chains))
    ]


def test_an_object_behind_a_wall_keeps_its_identity():
    """Hidden for 3 s, three times as long as the engine coasts."""
    frame, z, owner = crossing()
    log = log_of(frame, z)
    found = hindsight(log)
    assert len(found.pieces) == 24
    assert sorted(owners(found, log, owner)) == [{k} for k in range(12)]
    gaps = found.links.candidates.gap[found.links.made]
    assert np.allclose(gaps, 3.1)
    rows, online = rows_in_hindsight(log, found, settings())
    for k in np.unique(rows.track):
        own = rows.frame[rows.track == k]
        assert np.array_equal(own, np.arange(own[0], own[-1] + 1))
    between = rows.line < 0
    assert between.sum() == 12 * 30
    assert (rows.state[between] == TrackState.COASTING).all()
    assert (online[between] == -1).all()
    assert (online[~between] > 0).all()


def test_identities_are_the_first_pieces():
    frame, z, _ = crossing()
    log = log_of(frame, z)
    found = hindsight(log)
    first = found.chains.online[found.chains.start[:-1]]
    assert np.array_equal(found.chains.identity, first)


def test_smoothed_rows_behind_the_wall_are_near_the_truth():
    rng = np.random.default_rng(11)
    frame, z, true = [], [], []
    for k in range(30):
        states = walk(rng, 100, (0.0, 40.0 * k), (2.0, 0.5), 0.2)
        true.append(states[:, :2])
        for j in [*range(40), *range(60, 100)]:
            frame.append(j + 1)
            z.append(states[j, :2] + rng.normal(0, SIGMA, 2))
    log = log_of(frame, z)
    chosen = settings("motion.acceleration_noise=0.2")
    collector, born = collected(log, chosen)
    found = look_back(log, collector, chosen, born)
    assert len(found.chains) == 30
    rows, _ = rows_in_hindsight(log, found, chosen)
    between = np.flatnonzero(rows.line < 0)
    k = np.round((rows.z[between, 1] - 2.5) / 40.0).astype(int)
    error = rows.z[between] - np.array(true)[k, rows.frame[between] - 1]
    sigma = np.sqrt(rows.covariance[between][:, [0, 2]])
    # Consistent: the mean square in units of the stated spread is 1; 30 independent gaps.
    assert 0.6 < np.mean((error / sigma) ** 2) < 1.5


@pytest.mark.parametrize("what", ["too long", "too far", "backwards"])
def test_impossible_gaps_are_not_linked(what):
    rng = np.random.default_rng(2)
    jump = {"too long": (0.0, 0.0), "too far": (60.0, 0.0), "backwards": (0.0, 0.0)}[what]
    steps = 70 if what == "too long" else 30
    speed = -2.0 if what == "backwards" else 2.0
    before = walk(rng, 60, (0.0, 0.0), (2.0, 0.0))
    place = before[-1, :2] + (0.2 * steps if what != "backwards" else 9.0, 0.0)
    after = walk(rng, 60, place + jump, (speed, 0.0))
    frame = np.concatenate((np.arange(60), 60 + steps + np.arange(60))) + 1
    z = np.concatenate((before, after))[:, :2] + rng.normal(0, 0.05, (120, 2))
    # Others make up what is usual here; far away.
    other = crossing(seed=4, hidden=())
    log = log_of(np.concatenate((frame, other[0])), np.concatenate((z, other[1] + (0.0, 500.0))))
    found = hindsight(log, "hindsight.link_seconds=6")
    assert not (found.links.made & ~found.links.own).any()


def test_pieces_that_overlap_in_time_are_no_candidates():
    frame, z, _ = crossing(hidden=((50, 80), (110, 125)))
    found = hindsight(log_of(frame, z))
    weighed = found.links.candidates
    assert len(weighed.earlier) >= 20
    assert (found.pieces.last[weighed.earlier] < found.pieces.first[weighed.later]).all()
    assert (weighed.gap <= 4.0).all()


def close_calls():
    """Objects so near each other that several continuations are possible."""
    rng = np.random.default_rng(8)
    frame, z = [], []
    for k in range(5):
        states = walk(rng, 80, (0.0, 1.6 * k), (1.0, 0.0), 0.4)
        for j in [*range(25), *range(45, 80)]:
            frame.append(j + 1)
            z.append(states[j, :2] + rng.normal(0, SIGMA, 2))
    return log_of(frame, z)


def best(problem, *, without=(), forced=()):
    """The optimum by trying everything."""
    start, column, cost, miss, _ = problem
    options = []
    for i in range(len(miss)):
        own = [e for e in range(start[i], start[i + 1]) if e not in without]
        needed = [e for e in own if e in forced]
        options.append(needed or [-1, *own])
    least = np.inf
    for chosen in product(*options):
        columns = [column[e] for e in chosen if e >= 0]
        if len(set(columns)) == len(columns):
            total = sum(cost[e] if e >= 0 else miss[i] for i, e in enumerate(chosen))
            least = min(least, total)
    return least


def test_margins_and_force_costs_equal_brute_force():
    found = hindsight(close_calls(), "hindsight.link_margin=0")
    links = found.links
    optimum = best(links.problem)
    assert 3 <= links.chosen.sum() < len(links.chosen)
    for e in range(len(links.chosen)):
        if links.chosen[e]:
            assert links.margin[e] == pytest.approx(
                best(links.problem, without=(e,)) - optimum, abs=1e-9
            )
        else:
            assert links.force[e] == pytest.approx(
                best(links.problem, forced=(e,)) - optimum, abs=1e-9
            )


def test_a_link_that_is_too_doubtful_is_not_made():
    log = close_calls()
    free = hindsight(log, "hindsight.link_margin=0").links
    limit = float(np.median(free.margin[free.chosen]))
    strict = hindsight(log, f"hindsight.link_margin={limit}").links
    assert np.array_equal(strict.chosen, free.chosen)
    assert 0 < strict.made.sum() < free.made.sum()
    assert (strict.margin[strict.made] >= limit).all()


def test_evidence_equals_that_of_the_filter_run_through():
    """ln p(later detections | earlier piece) by the innovations of one filter over both."""
    frame, z, _ = crossing(objects=3)
    chosen = settings()
    log = log_of(frame, z)
    collector, _ = collected(log, chosen)
    scans, tracks = collector.finish()
    pieces = cut_in_doubt(tracks, scans, 0.5, 0.0)
    model = motion_model(chosen, Kind.POINT)
    variance = model.measurement_variance(log.z, None)
    ends = both_ends(model, pieces, scans, log.z, variance)
    i = 0
    j = int(np.argmin(np.linalg.norm(ends.origin - ends.mean[i, :2] - (6.2, 0.0), axis=1)))
    gap = scans.time[pieces.first[j]] - scans.time[pieces.last[i]]
    mean, covariance = ends.mean[[i]], ends.covariance[[i]]
    model.predict(mean, covariance, gap)
    evidence, distance = np.empty(1), np.empty(1)
    link_evidence(
        mean,
        covariance,
        np.array([j]),
        ends.origin,
        ends.information,
        ends.weighted,
        ends.spread,
        evidence,
        distance,
    )
    own = slice(pieces.start[j], pieces.start[j + 1])
    rows, when = pieces.row[own], scans.time[pieces.scan[own]]

    def innovations(state, spread, first):
        """ln p of the later piece's detections from number `first` on, predicted from a state."""
        total, before = 0.0, when[0]
        for k in range(first, len(rows)):
            step = transition(2, when[k] - before)
            if when[k] > before:
                state = step @ state
                spread = step @ spread @ step.T + process_noise([0.25] * 2, when[k] - before)
            s = spread[:2, :2] + SIGMA**2 * np.eye(2)
            total += multivariate_normal(state[:2], s).logpdf(log.z[rows[k]])
            gain = spread[:, :2] @ np.linalg.inv(s)
            state = state + gain @ (log.z[rows[k]] - state[:2])
            spread = spread - gain @ s @ gain.T
            before = when[k]
        return total

    linked = innovations(mean[0], covariance[0], 0)
    # A new object is at its first detection, which is as likely anywhere: density 1.
    fresh, fresh_spread = model.initiate(log.z[rows[:1]], variance[rows[:1]])
    alone = innovations(fresh[0], fresh_spread[0], 1)
    assert evidence[0] - ends.alone[j] == pytest.approx(linked - alone, rel=1e-7, abs=1e-7)


def test_the_order_of_the_log_does_not_matter():
    frame, z, _ = crossing()
    shuffled = np.random.default_rng(0).permutation(len(frame))
    shuffled = shuffled[np.argsort(frame[shuffled], kind="stable")]
    one = hindsight(log_of(frame, z))
    other = hindsight(log_of(frame[shuffled], z[shuffled]))
    place = []
    for found, log in ((one, log_of(frame, z)), (other, log_of(frame[shuffled], z[shuffled]))):
        names = found.chains.identity[found.chains.of_detection]
        rows = [tuple(row) for row in log.z[found.chains.row]]
        place.append(dict(zip(rows, names.tolist(), strict=True)))
    groups = [
        sorted(sorted(key for key, value in part.items() if value == k) for k in set(part.values()))
        for part in place
    ]
    assert groups[0] == groups[1]
    np.testing.assert_allclose(
        np.sort(one.links.candidates.cost), np.sort(other.links.candidates.cost), rtol=1e-9
    )


def test_labels_and_embeddings_speak_for_or_against():
    frame, z, owner = crossing(objects=2)
    late = (owner == 0) & (frame > 65)
    plain = hindsight(log_of(frame, z))
    label = np.where(late, 1, 0)
    labelled = hindsight(log_of(frame, z, labels=("cart", "person"), label=label))
    vectors = np.eye(2)[label]
    pictured = hindsight(log_of(frame, z, embedding=vectors))

    def cost(found, k):
        weighed = found.links.candidates
        own = [
            e
            for e in range(len(weighed.earlier))
            if found.pieces.identity[weighed.earlier[e]] == k + 1 and found.links.chosen[e]
        ]
        return weighed.cost[own[0]]

    # [cost.label] differ_nats 3 against the first, nothing for the second; [cost.appearance]
    # 6 nats x (0.5 - cosine): +3 and -3.
    assert cost(labelled, 0) - cost(plain, 0) == pytest.approx(3.0)
    assert cost(labelled, 1) == pytest.approx(cost(plain, 1))
    assert cost(pictured, 0) - cost(plain, 0) == pytest.approx(3.0)
    assert cost(pictured, 1) - cost(plain, 1) == pytest.approx(-3.0)


def test_a_track_that_was_cut_and_stays_cut_gets_a_new_id():
    """One detection far away after a gap, which the engine takes because its gate has grown."""
    rng = np.random.default_rng(1)
    states = walk(rng, 60, (0.0, 0.0), (2.0, 0.0))
    z = states[:, :2] + rng.normal(0, SIGMA, (60, 2))
    z[36:, 1] += 4.0  # after 0.6 s unseen it goes on four metres beside its course
    seen = np.r_[0:30, 36:60]
    others = crossing(seed=6, hidden=())
    log = log_of(
        np.concatenate((seen + 1, others[0])), np.concatenate((z[seen], others[1] + (0.0, 300.0)))
    )
    wide = ("motion.acceleration_noise=4", "gate.probability=0.999999")
    chosen = settings(*wide)
    collector, born = collected(log, chosen)
    assert born == 13
    narrow = replace_noise(chosen, 0.3)
    found = look_back(log, collector, narrow, born)
    assert sorted(found.chains.identity.tolist()) == [*range(1, 14), 14]
    assert len(found.pieces) == 14


def replace_noise(chosen, value):
    return replace(chosen, motion=replace(chosen.motion, acceleration_noise=value))


def pairs_that_cross():
    """Pairs whose ways cross; with loose noise the engine mixes some of them up."""
    rng = np.random.default_rng(5)
    frame, z, owner = [], [], []
    for k in range(12):
        for side in (-1.0, 1.0):
            t = np.arange(120) / 10.0
            states = np.column_stack((1.5 * t, 40.0 * k + side * (t - 6.0)))
            frame += range(1, 121)
            z += (states + rng.normal(0, SIGMA, states.shape)).tolist()
            owner += [2 * k + (side > 0)] * 120
    return np.array(frame), np.array(z), np.array(owner)


def test_a_contested_decision_is_taken_anew_with_both_sides_known():
    frame, z, owner = pairs_that_cross()
    log = log_of(frame, z)
    true = owner[log.line - 1]

    def right(cut_margin):
        """Objects that come out of the crossing as who they went in."""
        noise = ("motion.acceleration_noise=4", "hindsight.noise=measured")
        chosen = settings(*noise, f"hindsight.cut_margin={cut_margin}")
        collector, born = collected(log, chosen)
        chains = look_back(log, collector, chosen, born).chains
        assert len(chains) == 24
        parts = [
            true[chains.row[chains.start[k] : chains.start[k + 1]]] for k in range(len(chains))
        ]
        return sum(len({*part[:20], *part[-20:]}) == 1 for part in parts)

    kept, mended = right(0.0), right(1.0)
    assert kept < 18
    assert mended == 24


def test_confidence_goes_on_along_the_links():
    frame, z, _ = crossing(objects=2)
    log = log_of(frame, z)
    found = hindsight(log)
    links = found.links
    rows, _ = rows_in_hindsight(log, found, settings())
    for e in np.flatnonzero(links.made):
        identity = found.pieces.identity[links.candidates.earlier[e]]
        own = rows.track == identity
        last = found.pieces.last[links.candidates.earlier[e]] + 1
        first = found.pieces.first[links.candidates.later[e]] + 1
        before = rows.confidence[own & (rows.frame == last)][0]
        after = rows.confidence[own & (rows.frame == first)][0]
        assert after == pytest.approx(before / (1 + np.exp(-links.margin[e])), rel=1e-9)


def test_nothing_to_link():
    for frame, z in (
        ([1], [[0.0, 0.0]]),
        ([1, 2, 3], [[0.0, 0.0]] * 3),
        ([1, 1, 2, 2], [[0.0, 0.0], [90.0, 0.0]] * 2),
    ):
        found = hindsight(log_of(frame, z))
        rows, online = rows_in_hindsight(log_of(frame, z), found, settings())
        assert len(rows) == len(online) == len(found.chains.row)


def test_no_link_where_none_is_wanted():
    frame, z, _ = crossing()
    found = hindsight(log_of(frame, z), "hindsight.link_seconds=0")
    assert found.links is None
    assert len(found.chains) == 24
    assert found.facts()["links_made"] == 0
