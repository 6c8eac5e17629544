"""Identity switches in the sequences that the registry package motmetrics 1.4 ships.

motmetrics finds the switches, against its own truth; `explain` must then tell of each what the run
folder says of it.
"""

from __future__ import annotations

import json
import warnings

import numpy as np
import pyarrow.parquet as pq
import pytest

from tests.log.files import SHIPPED
from tracker.diagnosis import explain
from tracker.errors import InputError
from tracker.kernels.overlap import overlap_matrix
from tracker.log import read_truth
from tracker.results import read_run


def switches(run, truth_path):
    """[(frame, track before, track after)] by motmetrics, IoU of at least 0.5."""
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # pandas' about motmetrics' code
        import motmetrics as mm

        truth, tracks = read_truth(truth_path), read_run(run)
        accumulator = mm.MOTAccumulator()
        for frame in np.union1d(truth.frame, tracks.frame).tolist():
            a, b = truth.frame == frame, (tracks.frame == frame) & tracks.reported
            distance = 1.0 - overlap_matrix(truth.z[a], tracks.z[b])
            accumulator.update(
                truth.object[a].tolist(),
                tracks.track[b].tolist(),
                np.where(distance > 0.5, np.nan, distance),
                frameid=frame,
            )
        events = accumulator.mot_events.reset_index()
    paired = events[events.Type.isin(["MATCH", "SWITCH"])]
    found = []
    for _, event in paired[paired.Type == "SWITCH"].iterrows():
        past = paired[(paired.OId == event.OId) & (paired.FrameId < event.FrameId)]
        found.append((int(event.FrameId), int(past.HId.iloc[-1]), int(event.HId)))
    return found


@pytest.fixture(scope="module")
def found(stadtmitte_run):
    return switches(stadtmitte_run, SHIPPED / "TUD-Stadtmitte" / "gt.txt")


def test_there_are_switches(found):
    assert found, "else nothing is tested here"


def test_each_switch_tells_its_story(stadtmitte_run, found):
    decisions = pq.read_table(stadtmitte_run / "decisions.parquet").to_pylist()
    for frame, before, after in found:
        told = explain(stadtmitte_run, frame, track=after)
        json.dumps(told.as_dict(), allow_nan=False)
        text = told.text()
        view = told.track_view(after)
        # The new track has a detection here, or was started by one: which, and how sure that was.
        assert view.detection is not None
        row = next(
            r for r in decisions
            if r["chosen"] and (r["frame"], r["detection"]) == (frame, view.detection)
        )  # fmt: skip
        assert told.decisions[-1].margin == (None if np.isinf(row["margin"]) else row["margin"])
        assert f"detection {view.detection} (line {row['line']})" in text
        # And why the old one, if it still lived, did not get it: a force cost, or the gate.
        why = explain(stadtmitte_run, frame, detection=view.detection, others=[before]).why_not[0]
        assert why.verdict in ("worse", "outside gate", "not live")
        if why.verdict == "worse":
            assert any(change.track == before for change in why.alternative.changes)
        else:
            assert ("outside the gate" in why.reason) == (why.verdict == "outside gate")


def test_a_switch_by_a_lost_contest_names_the_rival(stadtmitte_run, found):
    """Of the switches, at least one is a close call between the two tracks concerned."""
    close = []
    for frame, before, after in found:
        try:
            told = explain(stadtmitte_run, frame, track=before)
        except InputError:
            continue  # it had ended
        for item in told.decisions:
            best = item.runner_up
            if item.contested and best is not None and best.decision == "pair":
                close += [change for change in best.changes if change.track == after]
    assert close
