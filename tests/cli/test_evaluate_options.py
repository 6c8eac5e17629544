"""`margent evaluate`: what is scored, per class, in several processes, and the self-check."""

from __future__ import annotations

import json

import pytest

import tracker.evaluation
from tests.log import files
from tests.log.files import SHIPPED
from tracker.cli.main import run

CAMPUS = SHIPPED / "TUD-Campus"
WORDS = [str(CAMPUS / "test.txt"), "--truth", str(CAMPUS / "gt.txt")]


@pytest.fixture
def pair(tmp_path):
    """Tracks on a person at x = 0 and a half hidden cart at x = 100."""
    truth = files.save(
        tmp_path / "quay",
        "frame,object,left,top,width,height,label,visibility\n"
        "1,a,0,0,10,20,person,1\n1,b,100,0,10,20,cart,0.5\n"
        "3,a,0,0,10,20,person,1\n3,b,100,0,10,20,cart,0.5\n",
        "truth.csv",
    )
    tracks = files.save(
        tmp_path / "quay",
        "frame,track,left,top,width,height\n"
        + "".join(f"{f},1,0,0,10,20\n{f},2,100,0,10,20\n" for f in (1, 2, 3)),
        "tracks.csv",
    )
    return [str(tracks), "--truth", str(truth)]


def counts(capsys, *words):
    assert run(["evaluate", *map(str, words), "--json"]) == 0
    found = json.loads(capsys.readouterr().out)["overall"]
    return found["matches"], found["false_positives"], found["misses"]


def test_what_is_scored(capsys, pair, tmp_path):
    region = files.save(tmp_path, "POLYGON ((90 -9, 120 -9, 120 50, 90 50, 90 -9))", "a.wkt")
    assert counts(capsys, *pair) == (4, 2, 0)
    assert counts(capsys, *pair, "--frame-stride", 1) == (4, 0, 0)
    assert counts(capsys, *pair, "--frame-stride", 2) == (2, 0, 0)
    assert counts(capsys, *pair, "--visibility-floor", 0.6) == (2, 2, 0)
    assert counts(capsys, *pair, "--ignore-region", region) == (2, 1, 0)
    assert counts(capsys, *pair, "--ignore-region", f"quay={region}") == (2, 1, 0)


def test_per_class(capsys, pair):
    assert run(["evaluate", *pair, "--per-class"]) == 0
    out = capsys.readouterr().out
    ratios = out.split("\n\n")[0].splitlines()
    assert [line.split("  ")[0] for line in ratios[2:]] == [
        "quay", "class cart", "class person",
    ]  # fmt: skip
    assert run(["evaluate", *pair, "--per-class", "--json"]) == 0
    found = json.loads(capsys.readouterr().out)
    assert list(found) == ["overall", "sequences", "classes"]
    assert found["classes"]["cart"]["matches"] == 2


def test_a_truth_of_something_else_is_noted(capsys):
    other = str(SHIPPED / "TUD-Stadtmitte" / "gt.txt")
    assert run(["evaluate", WORDS[0], "--truth", other, "--iou-threshold", "0.999"]) == 0
    assert "note: no track is ever on an object" in capsys.readouterr().err
    assert run(["evaluate", *WORDS]) == 0
    assert "note:" not in capsys.readouterr().err


def test_details(capsys):
    assert run(["evaluate", *WORDS, "--details"]) == 0
    out, err = capsys.readouterr()
    _, _, distances, durations, thresholds = (part.splitlines() for part in out.split("\n\n"))
    assert distances[0].split() == [
        "sequence", "LocA", "GOSPA", "localisation", "missed", "false", "OSPA",
    ]  # fmt: skip
    assert durations[0].split() == ["sequence", "length", "delay", "gaps", "recovery", "lost"]
    assert distances[2].startswith("test ")
    assert thresholds[0].split() == ["similarity", "HOTA", "DetA", "AssA", "LocA"]
    assert [line.split()[0] for line in thresholds[1:20]] == [f"{k / 20:.2f}" for k in range(1, 20)]
    assert "GOSPA and OSPA" in err


def test_workers(capsys):
    both = [SHIPPED / name for name in ("TUD-Campus", "TUD-Stadtmitte")]
    words = [str(path / "test.txt") for path in both]
    for path in both:
        words += ["--truth", str(path / "gt.txt")]
    found = []
    for workers in ("1", "2"):
        assert run(["evaluate", *words, "--json", "--workers", workers]) == 0
        found.append(capsys.readouterr().out)
    assert found[0] == found[1]


def test_self_check(capsys, monkeypatch):
    assert run(["evaluate", *WORDS, "--self-check"]) == 0
    assert "self-check of 'test': 100% (359 rows)" in capsys.readouterr().err
    monkeypatch.setattr(tracker.evaluation, "is_perfect", lambda scores: False)
    assert run(["evaluate", *WORDS, "--self-check"]) == 1
    assert "self-check of 'test': the truth against itself has 0 misses" in capsys.readouterr().err


@pytest.mark.parametrize(
    ("words", "sentence"),
    [
        (["--ignore-region", "none.toml"], "none.toml: there is no such file"),
        (["--visibility-floor", "2"], "visibility is between 0 and 1, not 2.0"),
        (["--frame-stride", "0"], "the frame stride is at least 1"),
        (["--score-class", "persn"], "did you mean 'person'?"),
        (["--workers", "0"], "--workers"),
    ],
)
def test_wrong_use(words, sentence, capsys, pair):
    assert run(["evaluate", *pair, *words]) == 2
    err = capsys.readouterr().err
    assert sentence in err
    assert "Traceback" not in err


def test_consistency(capsys, tmp_path):
    words = ["associate", WORDS[0], "--drop-identities", "--frame-rate-hz", "25"]
    assert run([*words, "--out", str(tmp_path / "run")]) == 0
    capsys.readouterr()
    words = ["evaluate", str(tmp_path / "run"), *WORDS[1:], "--consistency"]
    assert run(words) == 0
    out = capsys.readouterr().out
    assert "NEES" in out
    assert "NIS" in out
    assert run([*words, "--json"]) == 0
    found = json.loads(capsys.readouterr().out)
    (checks,) = found["consistency"].values()
    assert set(checks) == {"nees", "nis"}
    assert run(["evaluate", *WORDS, "--consistency"]) == 2
    assert "--consistency needs run folders" in capsys.readouterr().err


def test_rejected_truth_is_listed_and_strict_stops(capsys, tmp_path):
    truth = files.save(
        tmp_path,
        "frame,object,left,top,width,height\n1,a,0,0,10,20\n1,a,5,0,10,20\n2,a,0,0,-1,20\n",
        "truth.csv",
    )
    tracks = files.save(
        tmp_path, "frame,track,left,top,width,height\n1,1,0,0,10,20\n", "tracks.csv"
    )
    words = ["evaluate", str(tracks), "--truth", str(truth)]
    assert run(words) == 0
    err = capsys.readouterr().err
    assert "2 rows of" in err
    assert "line 3, column 'object': 'a' is in this frame already" in err
    assert "line 4, column 'width': must be greater than 0 (found '2,a,0,0,-1,20')" in err
    assert run([*words, "--strict"]) == 2
    assert "2 rows were rejected" in capsys.readouterr().err


@pytest.mark.parametrize(
    ("words", "sentence"),
    [
        (["--per-class"], "no truth has a column 'label'"),
        (["--visibility-floor", "0.5"], "no truth"),
    ],
)
def test_choices_that_no_truth_can_follow(words, sentence, capsys, tmp_path):
    truth = files.save(tmp_path, "frame,object,left,top,width,height\n1,a,0,0,10,20\n", "truth.csv")
    tracks = files.save(
        tmp_path, "frame,track,left,top,width,height\n1,1,0,0,10,20\n", "tracks.csv"
    )
    assert run(["evaluate", str(tracks), "--truth", str(truth), *words]) == 2
    assert sentence in capsys.readouterr().err
