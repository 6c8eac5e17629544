"""Findings of hand-made runs, and of the sequences that motmetrics ships."""

import csv
from pathlib import Path

import motmetrics
import numpy as np
import pytest

from tracker.causes import Cause, Error, diagnose, summary_dict, summary_text, write_causes
from tracker.errors import InputError
from tracker.evaluation import evaluate
from tracker.log import read_log, read_truth
from tracker.offline import associate_log
from tracker.results import read_run
from tracker.settings import load_settings

SHIPPED = Path(motmetrics.__file__).parent / "data"


def run_on(tmp_path, rows, truth_rows, settings=()):
    """Associate hand-made detections at 10 frames a second and diagnose them."""
    log, truth = tmp_path / "detections.csv", tmp_path / "truth.csv"
    write(log, "frame,left,top,width,height,score", rows)
    write(truth, "frame,object,left,top,width,height", truth_rows)
    chosen = load_settings(None, ("time.frame_rate_hz=10", *settings))
    associate_log(read_log(log, frame_rate_hz=10), chosen, tmp_path / "run")
    return diagnose(tmp_path / "run", read_truth(truth))


def write(path, header, rows):
    path.write_text("\n".join([header, *(",".join(map(str, row)) for row in rows)]) + "\n")


def standing(frames, left=100, score=0.9):
    return [(f, left, 100, 40, 80, score) for f in frames]


def annotated(frames, left=100, name="ada"):
    return [(f, name, left, 100, 40, 80) for f in frames]


def test_a_perfect_run_has_no_findings(tmp_path):
    found = run_on(tmp_path, standing(range(1, 20)), annotated(range(1, 20)))
    assert found.findings == ()
    assert "there are none" in summary_text(found)


def test_a_gap_longer_than_coasting_is_a_switch_that_names_the_limit(tmp_path):
    seen = [*range(1, 10), *range(30, 40)]
    found = run_on(tmp_path, standing(seen), annotated(range(1, 40)))
    (switch,) = found.of(Error.SWITCH)
    assert switch.cause is Cause.ENDED
    assert switch.measure == pytest.approx(2.1)  # last seen in frame 9, again in frame 30
    assert (switch.before, switch.track, switch.object) == (1, 2, "ada")
    assert "coasting limit 2 s" in switch.words
    (gap,) = found.of(Error.BREAK)
    assert (gap.frame, gap.last_frame, gap.rows) == (10, 29, 20)


def test_a_short_gap_is_a_break_for_want_of_detections(tmp_path):
    seen = [*range(1, 10), *range(13, 20)]
    found = run_on(tmp_path, standing(seen), annotated(range(1, 20)))
    (gap,) = found.findings
    assert (gap.error, gap.cause, gap.rows) == (Error.BREAK, Cause.NO_DETECTION, 3)


def test_a_jump_of_the_detections_is_outside_the_gate(tmp_path):
    rows = [*standing(range(1, 10)), *standing(range(10, 20), left=160)]
    truth = [*annotated(range(1, 10)), *annotated(range(10, 20), left=160)]
    found = run_on(tmp_path, rows, truth)
    (switch,) = found.of(Error.SWITCH)
    assert switch.cause is Cause.GATE
    assert switch.unit == "P_G needed"
    assert 0.999 < switch.measure <= 1.0


def test_an_annotation_that_jumps_is_suspicious(tmp_path):
    rows = [*standing(range(1, 10)), *standing(range(10, 20), left=900)]
    truth = [*annotated(range(1, 10)), *annotated(range(10, 20), left=900)]
    (switch,) = run_on(tmp_path, rows, truth).of(Error.SWITCH)
    assert switch.cause is Cause.TRUTH


def test_clutter_and_a_second_detection_on_an_object(tmp_path):
    rows = [
        *standing(range(1, 20)),
        *standing(range(5, 10), left=500),
        *standing(range(12, 16), left=118),
    ]
    found = run_on(tmp_path, sorted(rows), annotated(range(1, 20)))
    causes = {item.cause for item in found.of(Error.FALSE)}
    assert causes == {Cause.CLUTTER, Cause.DUPLICATE}


def test_weak_detections_below_the_birth_score(tmp_path):
    found = run_on(
        tmp_path,
        standing(range(1, 20), score=0.4),
        annotated(range(1, 20)),
        ("lifecycle.birth_score=0.5",),
    )
    (missed,) = found.findings
    assert (missed.error, missed.cause, missed.rows) == (Error.MISS, Cause.SCORE, 19)
    assert missed.measure == pytest.approx(0.4)


@pytest.mark.parametrize("name", ["TUD-Campus", "TUD-Stadtmitte"])
def test_shipped_sequences_every_error_has_a_cause(tmp_path, name):
    """Open data that motmetrics ships; identities removed."""
    log = read_log(SHIPPED / name / "test.txt", drop_identities=True, frame_rate_hz=25)
    associate_log(log, load_settings(), tmp_path / "run")
    truth = read_truth(SHIPPED / name / "gt.txt")
    found = diagnose(tmp_path / "run", truth)
    scores = evaluate(read_run(tmp_path / "run"), truth)
    assert len(found.of(Error.SWITCH)) == scores.counts.switches
    assert len(found.of(Error.BREAK)) == scores.counts.fragmentations
    missed = sum(item.rows for item in found.findings if item.error is not Error.SWITCH)
    assert missed == scores.counts.misses + scores.counts.false_positives
    write_causes(found, tmp_path / "causes.csv")
    rows = list(csv.DictReader((tmp_path / "causes.csv").open(encoding="utf-8")))
    assert len(rows) == len(found.findings)
    assert {row["cause"] for row in rows} <= {cause.value for cause in Cause}
    told = summary_dict(found)
    assert sum(sum(part.values()) for part in told["causes"].values()) == len(rows)
    shares = [point["share"] for curve in told["admitted"].values() for point in curve]
    assert np.all((np.array(shares) >= 0) & (np.array(shares) <= 1))


def test_a_run_without_ledger_is_refused(tmp_path):
    with pytest.raises(InputError, match="without a ledger"):
        run_on(tmp_path, standing(range(1, 5)), annotated(range(1, 5)), ("ledger.level=none",))
