"""The text, on whole explanations."""

from __future__ import annotations

import pytest

from tests.diagnosis.runs import CROSSING, made_log, made_run
from tracker.diagnosis import explain


def words(told):
    return " ".join(told.text().split())


def test_the_crossing_as_a_person_reads_it(crossing_run):
    said = words(explain(crossing_run, 10, track=1, others=[1]))
    for sentence in (
        "made, frame 10 (1.000 s): track 1",
        "Track 1 was given detection 0 (line 20).",
        "contested)",
        "In it track 1 takes detection 1 (line 21), track 2 takes detection 0 (line 20).",
        "2 tracks and 2 detections decided together",
        "runner-up, given to track 2",
        "Why not track 1 and detection 1 (line 21)?",
        "born in frame 1, confirmed in frame 2",
        "confirmed, last detection 0.1 s before; after this frame confirmed.",
        "track 2: confirmed, got detection 1 (line 21)",
        "afterwards missed in frame 14, found again in frame 15",
        "Tracks of people are personal data",
    ):
        assert sentence in said, sentence


def test_every_number_of_the_table_is_in_the_tree(crossing_run):
    told = explain(crossing_run, 10, track=1)
    text = told.text()
    for option in told.decisions[0].alternatives:
        assert f"{option.cost:.2f}" in text
        if not option.chosen:
            assert f"{option.force_cost:.2f}" in text
    view = told.track_view(1)
    assert f"x {view.position['x']:.3f} ± {view.sigma['x']:.3f}" in text


def test_an_exchange_is_told_once_in_a_frame(crossing_run):
    text = explain(crossing_run, 10).text()
    assert text.count("Runner-up") == 1
    assert "Track 1 was given detection 0" in text
    assert "Track 2 was given detection 1" in text
    assert "2 of 2 decisions are contested (margin below 2.30 nats, odds 10:1)" in words(
        explain(crossing_run, 10)
    )


def test_the_frame_is_marked_in_its_history(crossing_run):
    marked = [row for row in explain(crossing_run, 14, track=2).text().splitlines() if "→" in row]
    assert len(marked) == 1
    assert marked[0].split()[1:5] == ["14", "1.400", "confirmed", "missed"]


def test_births(crossing_run):
    assert "Track 3 was born in this frame, from detection 2 (line 33)." in words(
        explain(crossing_run, 16, track=3)
    )
    assert "It started track 3." in words(explain(crossing_run, 16, detection=2))


def test_nothing_at_all_to_decide(tmp_path):
    run = made_run(tmp_path / "run", made_log({1: [(0.0, 0.0)], 2: [(0.0, 0.0)]}))
    assert "none of 1 decisions is contested" in explain(run, 1).text()
    assert "nothing else was possible" in explain(run, 1).text()


@pytest.mark.parametrize("frame", [1, 10, 14, 16, 20])
def test_lines_end_where_they_should(crossing_run, frame):
    text = explain(crossing_run, frame).text()
    assert text.endswith("\n")
    assert not text.endswith("\n\n")
    assert all(line == line.rstrip() for line in text.splitlines())


def test_several_terms_have_a_column_each(tmp_path, crossing_run):
    run = made_run(
        tmp_path / "run",
        made_log({n: [(0.0, 0.0)] for n in range(1, 4)}),
        *CROSSING,
        'cost.terms=["mahalanobis", "label"]',
    )
    table = explain(run, 3, track=1).text()
    assert "label" in table
    assert "mahalanobis" in table
    # One term is the cost but for −ln P_D: no column of its own.
    alone = explain(crossing_run, 10, track=1).text()
    assert "mahalanobis  " not in alone
