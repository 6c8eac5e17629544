"""`margent evaluate --limit`: exit code 1, the table, JSON and JUnit XML."""

from __future__ import annotations

import json
from xml.etree import ElementTree

import pytest

from tests.log.files import SHIPPED
from tracker.cli.main import run

CAMPUS = SHIPPED / "TUD-Campus"
WORDS = ["evaluate", str(CAMPUS / "test.txt"), "--truth", str(CAMPUS / "gt.txt")]


def test_limits_met(capsys):
    assert run([*WORDS, "--limit", "idf1>=0.55", "--limit", "switches<=7"]) == 0
    out, err = capsys.readouterr()
    assert out.count("  overall  ") == 2
    assert "NOT MET" not in out
    assert "not met" not in err


def test_a_limit_that_is_not_met_is_exit_code_1_with_the_scores(capsys):
    assert run([*WORDS, "--limit", "idf1>=0.72", "--limit", "mota>=50%"]) == 1
    out, err = capsys.readouterr()
    assert "55.8%" in out
    assert "NOT MET  overall   idf1 >= 0.72  0.557659" in out
    assert "1 of 2 limits not met, the first: overall, idf1 >= 0.72 (found 0.557659)" in err


def test_json(capsys):
    assert run([*WORDS, "--limit", "idf1>=0.72", "--json"]) == 1
    found = json.loads(capsys.readouterr().out)
    assert set(found) == {"overall", "sequences", "limits"}
    assert found["limits"] == [
        {
            "sequence": None, "score": "idf1", "limit": ">=0.72",
            "found": found["overall"]["idf1"], "met": False,
        }
    ]  # fmt: skip


def test_junit_and_file(capsys, tmp_path):
    limits = tmp_path / "limits.toml"
    limits.write_text('[every]\nidf1 = ">=0.5"\n[sequences.test]\nmota = ">=0.6"\n', "utf-8")
    report = tmp_path / "report.xml"
    assert run([*WORDS, "--limits", str(limits), "--junit", str(report)]) == 1
    suite = ElementTree.parse(report).getroot()[0]
    assert (suite.get("tests"), suite.get("failures")) == ("2", "1")


@pytest.mark.parametrize(
    ("words", "sentence"),
    [
        (["--limit", "idf>=0.7"], "did you mean 'idf1'?"),
        (["--limits", "none.toml"], "none.toml: there is no such file"),
        (["--junit", "report.xml"], "--junit reports limits"),
        (["--limit", "idf1>=0.5", "--junit", "/dev/null/report.xml"], "cannot be written"),
        (["--referee", "maybe"], "--referee takes 'on' or 'off', found 'maybe'"),
    ],
)
def test_wrong_use(words, sentence, capsys):
    assert run([*WORDS, *words]) == 2
    err = capsys.readouterr().err
    assert sentence in err
    assert "Traceback" not in err


def test_without_the_referee_the_counts_are_the_same(capsys):
    found = []
    for word in ("on", "off"):
        assert run([*WORDS, "--referee", word, "--json"]) == 0
        found.append(capsys.readouterr().out)
    assert found[0] == found[1]
