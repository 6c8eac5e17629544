"""What was decided and what else was possible, against the ledger and against brute force."""

from __future__ import annotations

import json

import numpy as np
import pyarrow.parquet as pq
import pytest

from tests.diagnosis.runs import (
    CROSSING,
    all_answers,
    crossing,
    ledger_component,
    made_log,
    made_run,
    miss_nats,
)
from tracker.diagnosis import Explanation, explain
from tracker.diagnosis.explanation import LEDGER, RECOMPUTED, Change
from tracker.errors import InputError, UsageError

# Sums of a few costs, added up in another order.
ROUNDING = 1e-9


def rows_of(run, frame):
    return [r for r in pq.read_table(run / "decisions.parquet").to_pylist() if r["frame"] == frame]


def test_the_crossing_is_a_contested_exchange(crossing_run):
    told = explain(crossing_run, 10)
    assert (told.decided, told.contested, told.left_out) == (2, 2, 0)
    assert [(item.track, item.detection) for item in told.decisions] == [(1, 0), (2, 1)]
    for item in told.decisions:
        assert item.contested
        assert set(item.runner_up.changes) == {Change(1, 0, 1), Change(2, 1, 0)}
    assert {view.track for view in told.tracks} == {1, 2}
    assert told.history == ()  # of no single track


def test_a_quiet_frame_names_its_closest_decisions(crossing_run):
    told = explain(crossing_run, 6)
    assert told.contested == 0
    assert [item.track for item in told.decisions] == [1, 2]
    assert not any(item.contested for item in told.decisions)


def test_a_pair_is_told_from_both_sides(crossing_run):
    by_track, by_detection = (
        explain(crossing_run, 10, track=1),
        explain(crossing_run, 10, detection=0),
    )
    assert explain(crossing_run, 10, line=20) == by_detection
    one, other = by_track.decisions[0], by_detection.decisions[0]
    assert (one.track, one.detection, one.line) == (other.track, other.detection, 20)
    assert one.margin == other.margin
    assert [option.decision for option in one.alternatives] == ["pair", "pair", "miss"]
    assert [option.decision for option in other.alternatives] == ["pair", "pair", "new"]
    assert [option.track for option in other.alternatives] == [1, 2, None]
    assert one.alternatives[1].held_by == 2
    assert other.alternatives[1].holds == 1


def test_numbers_are_the_ledger_s(crossing_run):
    rows = {(r["track"], r["detection"]): r for r in rows_of(crossing_run, 10)}
    item = explain(crossing_run, 10, track=1).decisions[0]
    assert item.margin == rows[1, 0]["margin"]
    for option in item.alternatives[:2]:
        row = rows[option.track, option.detection]
        assert option.cost == row["cost"]
        assert option.gate.distance == row["distance"]
        assert option.terms == {"mahalanobis": row["cost_mahalanobis"]}
        assert option.source == LEDGER
    assert item.alternatives[1].force_cost == rows[1, 1]["force_cost"]
    prediction = next(
        r for r in pq.read_table(crossing_run / "predictions.parquet").to_pylist()
        if (r["frame"], r["track"]) == (10, 1)
    )  # fmt: skip
    view = explain(crossing_run, 10, track=1).track_view(1)
    assert view.state == prediction["state"]
    assert view.position == {"x": prediction["x"], "y": prediction["y"]}
    assert view.sigma["x"] == pytest.approx(prediction["covariance"][0] ** 0.5, rel=1e-15)
    assert view.unseen_seconds == pytest.approx(0.1)


@pytest.mark.parametrize("frame", range(3, 31, 3))
def test_alternatives_against_brute_force(crowd_run, frame):
    """Every force cost, margin and exchange of a crowded frame, by trying all assignments."""
    miss = miss_nats()
    record = explain(crowd_run, frame)
    for view in record.tracks:
        if view.state is None:
            continue
        costs, tracks, detections = ledger_component(crowd_run, frame, view.track)
        answers = list(all_answers(costs, tracks, detections, miss))
        optimum = min(cost for cost, _ in answers)
        for item in explain(crowd_run, frame, track=view.track).decisions:
            for option in item.alternatives:
                best = min(
                    cost for cost, answer in answers if answer[view.track] == option.detection
                )
                assert option.force_cost == pytest.approx(best - optimum, abs=ROUNDING)
            others = [c - optimum for c, a in answers if a[view.track] != item.detection]
            assert (item.margin is None) == (not others)
            if others:
                assert item.margin == pytest.approx(min(others), abs=ROUNDING)
                check_exchange(item, answers, optimum)


def check_exchange(item, answers, optimum):
    """The runner-up's changes turn the chosen answer into one that costs the margin more."""
    chosen = next(answer for cost, answer in answers if cost <= optimum + ROUNDING)
    changes = [change for change in item.runner_up.changes if change.track is not None]
    if not all(chosen[change.track] == change.before for change in changes):
        return  # a tie: another optimum was found first
    other = chosen | {change.track: change.after for change in changes}
    cost = next(cost for cost, answer in answers if answer == other)
    assert cost - optimum == pytest.approx(item.margin, abs=ROUNDING)
    left = {change.before for change in item.runner_up.changes if change.track is None}
    assert left == set(chosen.values()) - set(other.values()) - {None}


@pytest.mark.parametrize("frame", [5, 20, 40, 60])
def test_what_the_ledger_left_out_comes_out_as_the_full_one_has_it(campus_runs, frame):
    full, part = campus_runs["full"], campus_runs["contested"]
    for view in explain(full, frame).tracks:
        if view.state is None:
            continue
        one, other = (explain(run, frame, track=view.track) for run in (full, part))
        assert one.history == other.history
        assert one.tracks == other.tracks
        for whole, again in zip(one.decisions, other.decisions, strict=True):
            assert again.complete
            assert whole.margin == again.margin
            assert whole.outside == again.outside
            for a, b in zip(whole.alternatives, again.alternatives, strict=True):
                assert (a.track, a.detection, a.cost) == (b.track, b.detection, b.cost)
                assert (a.terms, a.changes, a.held_by) == (b.terms, b.changes, b.held_by)
                assert a.force_cost == pytest.approx(b.force_cost, abs=ROUNDING)
                if a.gate is not None:
                    assert a.gate.distance == b.gate.distance
                    assert a.gate.overlap == b.gate.overlap
            sources = {option.source for option in again.alternatives}
            recorded = any(row["contested"] for row in rows_of(part, frame)
                           if row["track"] == view.track)  # fmt: skip
            assert sources <= ({LEDGER} if recorded else {LEDGER, RECOMPUTED})
            assert again.alternatives[0].source == LEDGER  # what was chosen is always recorded
        assert any("marked *" in note for note in other.notes) == any(
            option.source == RECOMPUTED for item in other.decisions for option in item.alternatives
        )


def test_births_and_misses(crossing_run):
    born = explain(crossing_run, 16, track=3)
    assert born.decisions == explain(crossing_run, 16, detection=2).decisions
    item = born.decisions[0]
    assert (item.decision, item.margin, item.odds) == ("new", None, "no alternative")
    seen = born.detection_view(2)
    assert (seen.track, seen.starts_track) == (3, True)
    assert born.track_view(3).state is None
    assert born.track_view(3).state_after == "tentative"
    missed = explain(crossing_run, 14, track=2)
    assert missed.decisions[0].decision == "miss"
    assert missed.track_view(2).state_after == "coasting"
    assert missed.decisions[0].outside[0].detection == 0  # named although it is far off


def test_no_level_no_explanation(tmp_path):
    run = made_run(tmp_path / "run", crossing(), *CROSSING, level="none")
    with pytest.raises(InputError, match=r"without a ledger.*--set ledger\.level=full"):
        explain(run, 10)


@pytest.mark.parametrize(
    ("asked", "sentence"),
    [
        ({"frame": 21}, "there is no frame 21; frames go from 1 to 20"),
        ({"track": 9}, "there is no track 9; ids go from 1 to 3. Live in frame 10: 1, 2."),
        ({"track": 3}, "track 3 is not live in frame 10: born in frame 16, live until"),
        ({"detection": 2}, "frame 10 has no detection 2; they are numbered from 0 to 1"),
        ({"detection": -1}, "frame 10 has no detection -1"),
        ({"line": 5}, "no detection from line 5. That line is in frame 2."),
        ({"line": 900}, "no detection from line 900. Its lines are 20, 21."),
        ({"track": 1, "others": [7]}, "frame 10 has no detection 7"),
        ({"track": 1, "other_lines": [7]}, "no detection from line 7"),
        ({"detection": 0, "others": [9]}, "there is no track 9"),
    ],
)
def test_what_is_not_there(crossing_run, asked, sentence):
    with pytest.raises(InputError) as caught:
        explain(crossing_run, asked.pop("frame", 10), **asked)
    assert sentence in str(caught.value)
    assert caught.value.path == crossing_run


@pytest.mark.parametrize(
    "asked",
    [
        {"track": 1, "detection": 0},
        {"detection": 0, "line": 20},
        {"others": [1]},
        {"detection": 0, "other_lines": [3]},
    ],
)
def test_what_makes_no_sense(crossing_run, asked):
    with pytest.raises(UsageError):
        explain(crossing_run, 10, **asked)


def test_frames_without_anything(tmp_path):
    log = made_log({1: [(0, 0)], 2: [], 3: [], 9: [], 12: [(5, 5)]})
    run = made_run(tmp_path / "run", log)
    with pytest.raises(InputError, match=r"frame 9 has neither .* nearest that have are 3 and 12"):
        explain(run, 9)  # its track had ended
    assert explain(run, 2).decided == 1
    bare = made_run(tmp_path / "bare", made_log({1: [], 2: []}))
    with pytest.raises(InputError, match="neither detections nor tracks"):
        explain(bare, 1)


def test_the_tree_is_plain(crossing_run):
    told = explain(crossing_run, 10, track=1, others=[1])
    assert isinstance(told, Explanation)
    again = json.loads(json.dumps(told.as_dict(), allow_nan=False))
    assert again["decisions"][0]["margin"] == told.decisions[0].margin
    assert again["why_not"][0]["verdict"] == "worse"
    assert again == told.as_dict()
    with_limits = explain(crossing_run, 14, track=2).as_dict()
    json.dumps(with_limits, allow_nan=False)
    assert with_limits["decisions"][0]["margin"] is None


def test_cost_functions_that_are_not_there_any_more(tmp_path, monkeypatch):
    """What was chosen and its margin are still told; the gate too; costs are not made up."""
    from tracker.association import register_cost, terms

    monkeypatch.setattr(terms, "_registered", {})
    register_cost("a bias", lambda pairs: np.full(len(pairs), 0.25))
    words = (*CROSSING, 'cost.terms=["mahalanobis", "a bias"]', "ledger.contested_margin=0.1")
    runs = {
        level: made_run(tmp_path / level, crossing(), *words, level=level)
        for level in ("full", "contested")
    }
    monkeypatch.setattr(terms, "_registered", {})
    full, part = (explain(runs[level], 10, track=1).decisions[0] for level in runs)
    assert full.complete
    assert set(full.alternatives[0].terms) == {"mahalanobis", "a bias"}
    assert not part.complete
    assert part.margin == full.margin
    assert part.alternatives[0].cost == full.alternatives[0].cost
    rival = next(option for option in part.alternatives if option.detection == 1)
    assert (rival.cost, rival.force_cost, rival.terms) == (None, None, {})
    assert rival.gate.distance == full.alternatives[1].gate.distance
    told = explain(runs["contested"], 10, track=1, others=[1])
    assert "level=full" in "\n".join(told.notes)
    assert told.why_not[0].verdict == "worse"
    assert "cannot be told" in told.why_not[0].reason
    assert "?" in told.text()


def test_joint_mode_is_measured_with_its_coupled_covariances(tmp_path, crowd_log):
    words = (*CROSSING, 'association.mode="joint-probabilistic"')
    runs = [
        made_run(tmp_path / level, crowd_log, *words, "ledger.contested_margin=0.01", level=level)
        for level in ("full", "contested")
    ]
    for frame in (10, 20):
        full = explain(runs[0], frame)
        assert any("joint-probabilistic" in note for note in full.notes)
        for view in full.tracks:
            if view.state is None:
                continue
            one, other = (explain(run, frame, track=view.track).decisions for run in runs)
            for a, b in zip(one, other, strict=True):
                got = [option.gate and option.gate.distance for option in a.alternatives]
                assert got == [option.gate and option.gate.distance for option in b.alternatives]
