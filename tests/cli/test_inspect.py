"""`margent inspect` as a user types it."""

from __future__ import annotations

import json

import pytest

from tests.log import files
from tests.log.files import SHIPPED
from tracker.cli.main import run


def test_table_goes_to_standard_output(tmp_path, capsys):
    path = files.save(tmp_path, files.delimited(files.BOXES))
    assert run(["inspect", str(path)]) == 0
    out, err = capsys.readouterr()
    assert "4 used, 0 rejected" in out
    assert err == ""


def test_json(tmp_path, capsys):
    path = files.save(tmp_path, files.delimited(files.BOXES) + "1,2\n")
    assert run(["inspect", "--json", str(path), str(path)]) == 0
    logs = json.loads(capsys.readouterr().out)["logs"]
    assert [log["rows"] for log in logs] == [4, 4]
    assert logs[0]["rejections_by_reason"] == [
        {"column": "", "reason": "expected 7 fields, found 2", "count": 1, "first_line": 6}
    ]


def test_options(tmp_path, capsys):
    path = files.save(tmp_path, "f,x,y\n1,2,3\n2,3,4\n")
    assert run(["inspect", str(path), "--columns", "f=frame", "--frame-rate-hz", "5"]) == 0
    assert "5 Hz (settings)" in capsys.readouterr().out
    shipped = str(SHIPPED / "TUD-Campus" / "test.txt")
    assert run(["inspect", shipped, "--drop-identities", "--format", "benchmark"]) == 0
    assert "222 used" in capsys.readouterr().out


@pytest.mark.parametrize(
    ("arguments", "sentence"),
    [
        (["no.csv"], "no.csv: there is no such file"),
        ([str(SHIPPED / "TUD-Campus" / "gt.txt")], "add --drop-identities"),
        (["no.csv", "--format", "xml"], "no such file"),
        ([], "LOG"),
    ],
)
def test_failures_are_sentences(arguments, sentence, capsys):
    assert run(["inspect", *arguments]) == 2
    out, err = capsys.readouterr()
    assert out == ""
    assert sentence in err
    assert "Traceback" not in err


def test_one_bad_log_does_not_hide_the_others(tmp_path, capsys):
    good = files.save(tmp_path, files.delimited(files.BOXES))
    bad = files.save(tmp_path, "", "empty.csv")
    assert run(["inspect", str(bad), str(good)]) == 2
    out, err = capsys.readouterr()
    assert "4 used" in out
    assert "empty.csv: the file is empty" in err
