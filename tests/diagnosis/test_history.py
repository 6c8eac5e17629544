"""What a track did before and after."""

from __future__ import annotations

import csv

import pyarrow.parquet as pq
import pytest

from tests.diagnosis.runs import CROSSING, made_log, made_run
from tracker.diagnosis import explain
from tracker.diagnosis.history import Life, afterwards
from tracker.diagnosis.ledger_reading import Event


def test_the_frames_around(crossing_run):
    history = explain(crossing_run, 10, track=2).history
    assert [item.frame for item in history] == list(range(4, 17))
    assert [item.decision for item in history] == ["pair"] * 10 + ["miss"] + ["pair"] * 2
    missed, found = history[10], history[11]
    assert (missed.events, found.events) == (("missed",), ("found again",))
    assert (missed.state, found.state) == ("confirmed", "coasting")
    assert (missed.margin, missed.odds) == (None, "no alternative")
    assert [item.frame for item in history if item.contested] == [10]


def test_rows_agree_with_the_run_s_files(crossing_run):
    rows = {
        (row["frame"], row["track"]): row
        for row in pq.read_table(crossing_run / "decisions.parquet").to_pylist()
        if row["chosen"] and row["track"] is not None
    }
    with (crossing_run / "tracks.csv").open(encoding="utf-8") as file:
        shown = {(int(row["frame"]), int(row["track"])): row for row in csv.DictReader(file)}
    for track in (1, 2):
        for item in explain(crossing_run, 10, track=track).history:
            row = rows[item.frame, track]
            if item.margin is not None:
                assert item.margin == row["margin"]
            assert (item.detection, item.line) == (row["detection"], row["line"])
            line = shown[item.frame, track]
            assert f"{item.confidence:.4f}" == f"{float(line['confidence']):.4f}"
            assert item.time == pytest.approx(float(line["time"]))
            assert (item.line or "") == (int(line["line"]) if line["line"] else "")


def test_birth_and_confirmation(crossing_run):
    history = explain(crossing_run, 16, track=3).history
    assert [item.decision for item in history] == ["born", "pair", "pair", "pair", "pair"]
    assert (history[0].state, history[0].line) == (None, 33)
    assert history[1].events == ("hits reached",)
    view = explain(crossing_run, 16, track=3).track_view(3)
    assert (view.born_frame, view.confirmed_frame, view.ended_frame) == (16, 17, None)
    assert view.afterwards == "hits reached in frame 17"


def test_a_track_that_was_never_confirmed(tmp_path):
    frames = {1: [(0.0, 0.0)], 2: [], 3: [], 4: [(9.0, 9.0)]}
    told = explain(made_run(tmp_path / "run", made_log(frames), *CROSSING), 1, track=1)
    assert [item.decision for item in told.history] == ["born", "miss", "miss"]
    assert told.history[0].confidence is None  # it is in no track file
    assert told.track_view(1).afterwards == "ended in frame 3 (hits out of reach)"


def test_confirmed_at_birth(tmp_path):
    frames = {n: [(0.0, 0.0)] for n in range(1, 4)}
    run = made_run(tmp_path / "run", made_log(frames), "lifecycle.confirm_hits=1")
    view = explain(run, 1, track=1).track_view(1)
    assert (view.state, view.state_after, view.confirmed_frame) == (None, "confirmed", 1)


def at(item):
    return item.frame


def event(frame, after, reason, before="confirmed"):
    return Event(frame, frame / 10, 7, before, after, reason)


BIRTH = (event(1, "tentative", "born", None), event(2, "confirmed", "hits reached", "tentative"))


COMES_AND_GOES = (
    *(event(n, "coasting", "missed") for n in (9, 11)),
    *(event(n, "confirmed", "found again") for n in (10, 12)),
    event(13, "coasting", "missed"),
    event(20, "ended", "coast limit"),
)


@pytest.mark.parametrize(
    ("later", "frame", "words"),
    [
        ((), 5, "its state did not change before the run's end"),
        ((event(9, "coasting", "missed"),), 5, "missed in frame 9"),
        ((event(9, "coasting", "missed"), event(20, "ended", "coast limit")), 5,
         "missed in frame 9, ended in frame 20 (coast limit)"),
        ((event(5, "ended", "coast limit"),), 5, "it was over"),
        (COMES_AND_GOES, 5,
         "missed in frame 9, found again in frame 10, missed in frame 11, found again in frame 12, "
         "…, ended in frame 20 (coast limit)"),
    ],
)  # fmt: skip
def test_what_became_of_it(later, frame, words):
    ended = later[-1].frame if later and later[-1].after == "ended" else None
    assert afterwards(Life(1, 2, ended, BIRTH + tuple(sorted(later, key=at))), frame) == words
