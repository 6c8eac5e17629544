"""`margent report` as a user types it."""

from __future__ import annotations

import pytest

from tests.diagnosis.runs import CROSSING, crossing, made_run
from tracker.cli.main import run


@pytest.fixture(scope="module")
def folder(tmp_path_factory):
    return made_run(tmp_path_factory.mktemp("report") / "run", crossing(), *CROSSING)


def test_one_file_and_the_same_bytes_again(folder, tmp_path, capsys):
    one, two = tmp_path / "one.html", tmp_path / "two.html"
    assert run(["report", str(folder), "--out", str(one)]) == 0
    assert run(["report", str(folder), "--out", str(two)]) == 0
    assert one.read_bytes() == two.read_bytes()
    assert sorted(tmp_path.iterdir()) == [one, two]
    out, err = capsys.readouterr()
    assert out == ""
    assert str(one) in err


def test_no_run(tmp_path, capsys):
    assert run(["report", str(tmp_path), "--out", str(tmp_path / "page.html")]) == 2
    assert "neither a run folder" in capsys.readouterr().err


def test_no_ledger(tmp_path, capsys):
    bare = made_run(tmp_path / "run", crossing(), *CROSSING)
    (bare / "decisions.parquet").unlink()
    assert run(["report", str(bare), "--out", str(tmp_path / "page.html")]) == 2
    assert "has no ledger" in capsys.readouterr().err
    assert not (tmp_path / "page.html").exists()


def test_a_place_that_cannot_be_written(folder, tmp_path, capsys):
    assert run(["report", str(folder), "--out", str(tmp_path / "nowhere" / "page.html")]) == 2
    assert "cannot be written" in capsys.readouterr().err
