"""Limits on scores, their file, and the JUnit report."""

from __future__ import annotations

from xml.etree import ElementTree

import pytest

from tests.evaluation.made import make_tracks, make_truth, standing
from tracker.errors import InputError, OutputError, UsageError
from tracker.evaluation import evaluate_all
from tracker.evaluation.junit import junit_text, write_junit
from tracker.evaluation.limits import Limit, judge, parse_limit, read_limits, verdict_table


@pytest.fixture(scope="module")
def scored():
    """IDF1 0.5 in 'half', 1 in 'whole', 0.75 overall."""
    half = make_tracks(standing(range(1, 6), 1) + standing(range(6, 11), 2))
    whole = make_tracks(standing(range(1, 11), 1))
    truth = make_truth(standing(range(1, 11), 7))
    return evaluate_all({"half": (half, truth), "whole": (whole, truth)})


@pytest.mark.parametrize(
    ("text", "limit"),
    [
        ("idf1>=0.72", Limit("idf1", ">=", 0.72)),
        (" idf1 >= 72 % ", Limit("idf1", ">=", 0.72)),
        ("switches<=10", Limit("switches", "<=", 10.0)),
        ("mota>-0.5", Limit("mota", ">", -0.5)),
        ("motp<1e1", Limit("motp", "<", 10.0)),
    ],
)
def test_limits_are_read(text, limit):
    assert parse_limit(text) == limit


@pytest.mark.parametrize(
    ("text", "sentence"),
    [
        ("idf>=0.7", "there is no score 'idf'; did you mean 'idf1'?"),
        ("swiches<=3", "did you mean 'switches'?"),
        ("zzz<=3", "there is no score 'zzz' \\("),
        ("idf1=0.7", "reads like 'idf1>=0.72'"),
        ("idf1>=", "reads like"),
        ("idf1>=much", "reads like"),
        ("idf1>=1e", "reads like"),
        ("idf1>=72", "write 0.72 or 72%"),
        ("switches<=10%", "no ratio"),
        ("hota_by_threshold>=1", "there is no score"),
    ],
)
def test_bad_limits(text, sentence):
    with pytest.raises(UsageError, match=sentence):
        parse_limit(text)


@pytest.mark.parametrize(
    ("text", "met"),
    [
        ("idf1>=0.75", True), ("idf1>0.75", False), ("idf1<=0.75", True), ("idf1<0.75", False),
        ("switches<=0", False), ("switches<2", True),
    ],
)  # fmt: skip
def test_borders(scored, text, met):
    assert judge(scored, [parse_limit(text)])[0].met is met


def test_a_score_without_a_value_fails():
    nothing = evaluate_all({"empty": (make_tracks([]), make_truth([]))})
    verdict = judge(nothing, [parse_limit("idf1>=0")])[0]
    assert not verdict.met
    assert "no value" in verdict_table([verdict])


def write(tmp_path, text):
    path = tmp_path / "limits.toml"
    path.write_text(text, encoding="utf-8")
    return path


FILE = """
[overall]
idf1 = ">=0.7"
[every]
mota = ">= 0.95"
[sequences.half]
switches = ["<=1", ">=1"]
"""


def test_file(scored, tmp_path):
    limits = read_limits(write(tmp_path, FILE), list(scored.sequences))
    found = [(verdict.where, verdict.limit.words, verdict.met) for verdict in judge(scored, limits)]
    assert found == [
        ("overall", "idf1 >= 0.7", True),
        ("half", "mota >= 0.95", False),
        ("whole", "mota >= 0.95", True),
        ("half", "switches <= 1", True),
        ("half", "switches >= 1", True),
    ]


@pytest.mark.parametrize(
    ("text", "error", "sentence"),
    [
        ("overall", InputError, "cannot be read as TOML"),
        ("", InputError, "has no limits"),
        ("[total]\nidf1='>=1'", InputError, "no such table"),
        ("overall = 3", InputError, "overall is not a table"),
        ("[overall]\nidf1 = 0.7", InputError, "a limit is text"),
        ("[overall]\nidf = '>=0.7'", UsageError, "overall.idf: there is no score 'idf'"),
        ("[sequences.third]\nidf1 = '>=0.7'", UsageError, "no sequence 'third'"),
        ("sequences = 3", InputError, "sequences is not a table"),
    ],
)
def test_bad_files(text, error, sentence, tmp_path):
    with pytest.raises(error, match=sentence):
        read_limits(write(tmp_path, text), ["half", "whole"])


def test_missing_file(tmp_path):
    with pytest.raises(InputError, match="no such file"):
        read_limits(tmp_path / "none.toml", ["half"])


ALLOWED = {  # element: its attributes, those required, its children
    "testsuites": ({"name", "tests", "failures", "errors", "time"}, set(), {"testsuite"}),
    "testsuite": (
        {"name", "tests", "failures", "errors", "skipped", "time"}, {"name"}, {"testcase"},
    ),
    "testcase": ({"name", "classname", "time"}, {"name"}, {"failure"}),
    "failure": ({"message", "type"}, set(), set()),
}  # fmt: skip


class TestJunit:
    """Against the common schema (Jenkins' junit-10.xsd, from memory)."""

    def verdicts(self, scored):
        return judge(scored, [parse_limit("idf1>=0.7"), parse_limit("switches<=0", "half")])

    def test_elements_and_counts(self, scored):
        text = junit_text(self.verdicts(scored))
        root = ElementTree.fromstring(text.encode())
        assert root.tag == "testsuites"
        for element in root.iter():
            attributes, required, children = ALLOWED[element.tag]
            assert required <= set(element.attrib) <= attributes
            assert {child.tag for child in element} <= children
        suite = root[0]
        assert (suite.get("tests"), suite.get("failures"), suite.get("errors")) == ("2", "1", "0")
        assert [case.get("classname") for case in suite] == ["overall", "half"]
        assert suite[1][0].get("message") == "switches is 1, the limit is switches <= 0"

    def test_names_that_xml_cannot_hold(self, scored):
        strange = 'a<b>&"\x00\x1b'
        evaluation = type(scored)({strange: scored.sequences["half"]})
        text = junit_text(judge(evaluation, [parse_limit("idf1>=0.7", strange)]))
        case = ElementTree.fromstring(text.encode())[0][0]
        assert case.get("classname") == 'a<b>&"??'

    def test_written_whole_or_not_at_all(self, scored, tmp_path):
        path = tmp_path / "new" / "report.xml"
        write_junit(path, self.verdicts(scored))
        first = path.read_bytes()
        write_junit(path, self.verdicts(scored))
        assert path.read_bytes() == first
        assert [item.name for item in path.parent.iterdir()] == ["report.xml"]
        with pytest.raises(OutputError, match="cannot be written"):
            write_junit(path / "below.xml", self.verdicts(scored))
        (tmp_path / "folder").mkdir()
        with pytest.raises(OutputError, match="cannot be written"):
            write_junit(tmp_path / "folder", self.verdicts(scored))
        assert sorted(item.name for item in tmp_path.iterdir()) == ["folder", "new"]
