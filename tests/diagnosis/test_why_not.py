"""Every reason for which a track was not given a detection."""

from __future__ import annotations

import pytest

from tests.diagnosis.runs import CROSSING, made_log, made_run
from tracker.diagnosis import explain
from tracker.diagnosis.explanation import Change


def verdict(run, frame, track, detection):
    """The answer, asked from both sides."""
    answer = explain(run, frame, track=track, others=[detection]).why_not[0]
    assert answer == explain(run, frame, detection=detection, others=[track]).why_not[0]
    return answer


def test_worse(crossing_run):
    answer = verdict(crossing_run, 10, 1, 1)
    assert answer.verdict == "worse"
    option = answer.alternative
    assert (option.held_by, option.holds) == (2, 0)
    assert set(option.changes) == {Change(1, 0, 1), Change(2, 1, 0)}
    assert "track 2 was given the detection" in answer.reason
    assert "track 1 takes detection 1 (line 21), track 2 takes detection 0 (line 20)" in (
        answer.reason
    )


def test_chosen(crossing_run):
    assert verdict(crossing_run, 10, 2, 1).verdict == "chosen"


def test_outside(crossing_run):
    answer = verdict(crossing_run, 18, 1, 2)
    assert answer.verdict == "outside gate"
    assert not answer.gate.inside
    assert answer.alternative is None


@pytest.mark.parametrize(
    ("frame", "track", "words"),
    [
        (10, 3, "did not exist yet: born in frame 16"),
        (16, 3, "only born in this frame, after its pairs had been decided"),
    ],
)
def test_not_yet_live(crossing_run, frame, track, words):
    answer = explain(crossing_run, frame, detection=0, others=[track]).why_not[0]
    assert answer.verdict == "not live"
    assert words in answer.reason
    assert answer.gate is None


def test_no_longer_live(tmp_path):
    frames = {n: [(0.0, 0.0)] for n in range(1, 5)} | {n: [(50.0, 0.0)] for n in range(5, 30)}
    run = made_run(tmp_path / "run", made_log(frames), "lifecycle.coast_seconds=1.0")
    answer = explain(run, 25, detection=0, others=[1]).why_not[0]
    assert "no longer existed: born in frame 1, ended in frame 15 (coast limit)" in answer.reason
    ending = explain(run, 15, track=1, others=[0])
    assert ending.decisions == ()
    assert "before its detections were looked at" in ending.why_not[0].reason
    assert any("ended in this frame (coast limit)" in note for note in ending.notes)
    assert ending.history[-1].decision == "ended"


def test_a_tie_says_so(tmp_path):
    """Two detections exactly as far from where the track is expected."""
    frames = {n: [(0.0, 0.0)] for n in range(1, 6)} | {6: [(0.1, 0.0), (-0.1, 0.0)]}
    run = made_run(tmp_path / "run", made_log(frames))
    told = explain(run, 6, track=1, others=[1])
    assert told.decisions[0].detection == 0
    assert told.decisions[0].margin == pytest.approx(0.0, abs=1e-14)  # rounding of the estimate
    assert told.decisions[0].odds == "even"
    assert "a tie" in told.why_not[0].reason
    assert "a tie" in told.text()
    assert "a tie" in explain(run, 6).text()


TIERS = (
    *CROSSING,
    'tiers=[{name="sure", score_from=0.6},'
    ' {name="weak", score_from=0.2, score_below=0.6, states=["confirmed", "coasting"]}]',
    "lifecycle.birth_score=0.6",
)


@pytest.fixture(scope="module")
def tiered(tmp_path_factory):
    """Track 1 is seen surely, track 2 weakly from frame 5; frame 6 has a hopeless detection too,
    and frame 7 a new object beside a weak detection."""
    frames, score = {}, []
    for n in range(1, 8):
        rows = [(0.02 * n, 0.0), (0.02 * n, 0.4)]
        sure = [0.9, 0.9 if n < 5 else 0.4]
        if n == 6:
            rows.append((0.1, 0.2))
            sure.append(0.1)
        if n == 7:
            rows += [(5.0, 5.0), (5.1, 5.0)]
            sure += [0.8, 0.3]
        frames[n] = rows
        score += sure
    log = made_log(frames, score=score_array(score))
    return made_run(tmp_path_factory.mktemp("tiered") / "run", log, *TIERS)


def score_array(values):
    import numpy as np

    return np.array(values)


def test_what_each_tier_decided(tiered):
    told = explain(tiered, 6, track=2)
    assert [(item.tier_name, item.decision) for item in told.decisions] == [
        ("sure", "miss"), ("weak", "pair"),
    ]  # fmt: skip
    assert told.history[-1].decision == "pair"  # the later tier's word counts
    assert any("within a tier" in note for note in told.notes)
    assert "in tier 'weak'" in told.text()
    assert [item.tier_name for item in explain(tiered, 6, detection=1).decisions] == ["weak"]


def test_already_paired(tiered):
    answer = verdict(tiered, 6, 1, 1)
    assert answer.verdict == "already paired"
    assert "the track had already been given detection 0" in answer.reason
    assert "score 0.4 is outside its range (at least 0.6)" in answer.reason
    assert answer.gate is not None


def test_a_detection_that_no_tier_takes(tiered):
    told = explain(tiered, 6, detection=2, others=[2])
    assert told.decisions == ()
    assert told.why_not[0].verdict == "different tiers"
    assert "score 0.1 is outside its range (at least 0.2 and below 0.6)" in told.why_not[0].reason
    assert any("took part in no tier: its score 0.1" in note for note in told.notes)
    assert "started no track (score 0.1)" in told.text()


def test_a_tier_for_other_states(tmp_path):
    frames = {n: [(0.0, 0.0)] for n in range(1, 4)} | {4: [(0.0, 0.0), (3.0, 3.0)], 5: [(3.0, 3.0)]}
    words = ('tiers=[{name="old", states=["confirmed", "coasting"]}]',)
    run = made_run(tmp_path / "run", made_log(frames), *CROSSING, *words)
    told = explain(run, 2, track=1, others=[0])
    assert told.decisions == ()
    assert "it takes tracks that are confirmed or coasting, this one was tentative" in (
        told.why_not[0].reason
    )
    assert any("took part in no tier" in note for note in told.notes)
