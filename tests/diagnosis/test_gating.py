"""Pairs outside the gate: by how much, and what would have admitted them."""

from __future__ import annotations

import numpy as np
import pyarrow.parquet as pq
import pytest
from scipy import stats

from tests.diagnosis.runs import made_log, made_run
from tracker.association.rule import association_rules
from tracker.diagnosis import explain
from tracker.diagnosis.explanation import RECOMPUTED
from tracker.diagnosis.gating import gate_of
from tracker.log.model import Kind
from tracker.settings import Settings


# NIST/SEMATECH e-Handbook 1.3.6.7.4: upper critical values of chi-square.
@pytest.mark.parametrize(
    ("kind", "distance", "probability"),
    [
        (Kind.POINT, 5.991, 0.95), (Kind.POINT, 9.210, 0.99), (Kind.POINT, 13.816, 0.999),
        (Kind.BOX, 9.488, 0.95), (Kind.BOX, 13.277, 0.99), (Kind.BOX, 18.467, 0.999),
    ],
)  # fmt: skip
def test_the_probability_that_would_admit_is_chi_square(kind, distance, probability):
    rule = association_rules(Settings(), kind)[0]
    gate = gate_of(rule, 0.999, distance, 0.5 if kind is Kind.BOX else None, RECOMPUTED)
    rounding = 0.0005 * stats.chi2.pdf(distance, kind.dimension)  # the table has three decimals
    assert 1.0 - gate.tail_needed == pytest.approx(probability, abs=rounding)


def test_the_border():
    rule = association_rules(Settings(), Kind.POINT)[0]
    assert gate_of(rule, 0.999, rule.threshold, None, RECOMPUTED).inside
    assert not gate_of(rule, 0.999, np.nextafter(rule.threshold, 99), None, RECOMPUTED).inside


NOISY = "motion.acceleration_noise=5.0"
JUMP = {n: [(0.05 * n, 0.0)] for n in range(1, 8)} | {8: [(1.4, 0.0)]}


def test_a_point_outside(tmp_path):
    """d² and its tail by other means; and the told probability does admit the pair."""
    run = made_run(tmp_path / "run", made_log(JUMP), NOISY)
    told = explain(run, 8, track=1, others=[0])
    near = told.decisions[0].outside[0]
    gate = near.gate
    assert told.why_not[0].verdict == "outside gate"
    assert told.why_not[0].gate == gate
    assert (gate.inside, gate.source, gate.overlap) == (False, RECOMPUTED, None)
    expected = {
        name: next(r for r in pq.read_table(run / name).to_pylist() if r["frame"] == 8)
        for name in ("predictions.parquet", "detections.parquet")
    }
    was, seen = expected.values()
    spread = np.array([[was["covariance"][0], was["covariance"][1]],
                       [was["covariance"][1], was["covariance"][2]]])  # fmt: skip
    spread += np.diag([seen["variance_x"], seen["variance_y"]])
    off = np.array([seen["x"] - was["x"], seen["y"] - was["y"]])
    d2 = off @ np.linalg.solve(spread, off)
    assert gate.distance == pytest.approx(d2, rel=1e-12)
    assert gate.tail_needed == pytest.approx(stats.chi2.sf(d2, 2), rel=1e-9)
    assert 1e-9 < gate.tail_needed < 1e-3, "else the scene is no test"
    for factor, admitted in ((1.01, False), (0.99, True)):
        wider = f"gate.probability={1.0 - factor * gate.tail_needed!r}"
        again = explain(made_run(tmp_path / wider, made_log(JUMP), wider, NOISY), 8, track=1)
        pairs = [o for o in again.decisions[0].alternatives if o.decision == "pair"]
        assert bool(pairs) is admitted


BOXES = {n: [(4.0 * n, 50.0, 20.0, 40.0)] for n in range(1, 8)} | {8: [(44.0, 60.0, 20.0, 40.0)]}


def test_boxes_with_an_overlap_floor_alone(tmp_path):
    log = made_log(BOXES, Kind.BOX)
    words = ('gate.probability="none"', "gate.overlap_floor=0.4")
    told = explain(made_run(tmp_path / "run", log, *words), 8, track=1, others=[0])
    gate = told.decisions[0].outside[0].gate
    assert (gate.distance_limit, gate.gate_probability) == (None, None)
    assert (gate.inside, gate.overlap_floor) == (False, 0.4)
    view, seen = told.track_view(1).position, told.detection_view(0).position

    def interval(place, centre, size):
        return place[centre] - place[size] / 2, place[centre] + place[size] / 2

    shared = 1.0
    for axis in (("x", "width"), ("y", "height")):
        (a, b), (c, d) = interval(view, *axis), interval(seen, *axis)
        shared *= min(b, d) - max(a, c)
    whole = view["width"] * view["height"] + seen["width"] * seen["height"] - shared
    assert gate.overlap == pytest.approx(shared / whole, rel=1e-12)
    assert told.why_not[0].reason == f"outside the gate: IoU is {shared / whole:.3g}, the floor 0.4"


def test_boxes_outside_both(tmp_path):
    log = made_log(BOXES | {8: [(300.0, 60.0, 20.0, 40.0)]}, Kind.BOX)
    told = explain(made_run(tmp_path / "run", log, "gate.overlap_floor=0.3"), 8, track=1)
    words = " ".join(told.text().split())
    assert "no gate probability would have admitted it; IoU is 0, the floor 0.3" in words


def test_the_nearest_are_named_nearest_first(tmp_path):
    frames = {n: [(0.0, 0.0)] for n in range(1, 6)}
    frames[6] = [(9.0, 0.0), (1.5, 0.0), (0.0, 1.2), (2.0, 0.0), (0.0, -1.9), (0.0, 0.01)]
    run = made_run(tmp_path / "run", made_log(frames), NOISY)
    item = explain(run, 6, track=1).decisions[0]
    assert item.detection == 5
    assert [near.detection for near in item.outside] == [2, 1, 4]
    distances = [near.gate.distance for near in item.outside]
    assert distances == sorted(distances)
