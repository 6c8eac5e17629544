"""Tracks that others hide are detected less, and are not blamed for it."""

import math

import numpy as np
import pyarrow.parquet as pq
import pytest

from tests.diagnosis.runs import made_log, made_run
from tracker import Engine, Frame, load_settings
from tracker.diagnosis import explain
from tracker.errors import SettingsError
from tracker.log.model import Kind

NEAR, FAR = (0.0, 20.0, 40.0, 80.0), (5.0, 10.0, 40.0, 80.0)  # left, top, width, height


def behind(first_missing=6, frames=8):
    """Two people; the one behind is not seen from a frame on."""
    return {n: [NEAR] if n >= first_missing else [NEAR, FAR] for n in range(1, frames + 1)}


def costs(tmp_path, *settings):
    run = made_run(tmp_path / "run", made_log(behind(), Kind.BOX), *settings)
    rows = pq.read_table(run / "decisions.parquet").to_pylist()
    return run, {row["track"]: row["cost"] for row in rows
                 if row["decision"] == "miss" and row["frame"] == 6}  # fmt: skip


def test_missing_a_hidden_track_costs_little(tmp_path):
    """35 of 40 by 70 of 80 are covered: a share of 0.234375 is visible."""
    _, plain = costs(tmp_path / "a")
    _, hidden = costs(tmp_path / "b", "sensor.hidden_below=0.9999999")
    assert plain == {2: pytest.approx(-math.log(1 - 0.9 * 0.999))}
    assert hidden == {2: pytest.approx(-math.log(1 - 0.9 * 0.234375 * 0.999), rel=1e-4)}
    _, enough = costs(tmp_path / "c", "sensor.hidden_below=0.2")
    assert enough == plain


def test_the_ledger_says_so_and_explain_agrees(tmp_path):
    """The costs of a run whose P_D differs by track are found again from its files."""
    run, _ = costs(tmp_path, "sensor.hidden_below=0.5", "ledger.level=contested")
    seen = pq.read_table(run / "predictions.parquet").to_pylist()
    found = {(row["frame"], row["track"]): row["detection_probability"] for row in seen}
    assert found[5, 1] == 0.9
    assert found[5, 2] == pytest.approx(0.9 * 0.234375 / 0.5, rel=0.01)
    for frame in (5, 6):
        told = explain(run, frame, track=2)
        chosen = next(o for o in told.decisions[0].alternatives if o.chosen)
        rows = [r for r in pq.read_table(run / "decisions.parquet").to_pylist()
                if r["frame"] == frame and r["track"] == 2 and r["chosen"]]  # fmt: skip
        assert chosen.cost == pytest.approx(rows[0]["cost"], abs=1e-12)
        assert told.decisions[0].margin == pytest.approx(rows[0]["margin"], abs=1e-9)


def test_evidence_forgives_what_is_hidden():
    """By Wald's test a track that should have been seen is gone long before a hidden one."""
    lived = {}
    for name, hidden in (("plain", ()), ("hidden", ("sensor.hidden_below=0.9",))):
        engine = Engine(load_settings(None, ("lifecycle.rule=evidence", *hidden)), "box")
        for n, rows in behind(first_missing=10, frames=60).items():
            result = engine.step(Frame.of_boxes(n, 0.04 * n, rows))
            if 2 in result.track.tolist():
                lived[name] = n
    assert lived["hidden"] > lived["plain"] + 5


def test_points_hide_nothing():
    with pytest.raises(SettingsError, match="hidden_below"):
        Engine(load_settings(None, ("sensor.hidden_below=0.5",)), "point")


def test_nobody_hides_where_nobody_is_confirmed():
    engine = Engine(load_settings(None, ("sensor.hidden_below=0.5",)), "box")
    engine.step(Frame.of_boxes(1, 0.0, [NEAR, FAR]))
    result = engine.step(Frame.of_boxes(2, 0.04, [NEAR, FAR]))
    np.testing.assert_array_equal(result.prediction.detected, 0.9)
