"""`margent explain` as a user types it."""

from __future__ import annotations

import json

import pytest

from tests.diagnosis.runs import CROSSING, crossing, made_run
from tracker.cli.main import run


@pytest.fixture(scope="module")
def folder(tmp_path_factory):
    return str(made_run(tmp_path_factory.mktemp("explain") / "run", crossing(), *CROSSING))


def test_text_goes_to_standard_output(folder, capsys):
    assert run(["explain", folder, "--frame", "10", "--track", "1", "--why-not", "1"]) == 0
    out, _ = capsys.readouterr()
    assert "Track 1 was given detection 0 (line 20)." in out
    assert "Why not track 1 and detection 1 (line 21)?" in out


def test_whole_frame(folder, capsys):
    assert run(["explain", folder, "--frame", "10"]) == 0
    assert "2 of 2 decisions are contested" in capsys.readouterr().out


def test_json_alone_is_on_standard_output(folder, capsys):
    assert run(["explain", folder, "--frame", "10", "--line", "20", "--json"]) == 0
    told = json.loads(capsys.readouterr().out)
    assert (told["frame"], told["detection"], told["decisions"][0]["track"]) == (10, 0, 1)


def test_why_not_by_line(folder, capsys):
    words = ["explain", folder, "--frame", "10", "--track", "1", "--json"]
    told = []
    for pair in ("1", "line:21"):
        assert run([*words, "--why-not", pair]) == 0
        told.append(json.loads(capsys.readouterr().out)["why_not"])
    assert told[0] == told[1]


def test_picture(folder, tmp_path, capsys):
    path = tmp_path / "decision.png"
    assert run(["explain", folder, "--frame", "10", "--track", "1", "--picture", str(path)]) == 0
    out, err = capsys.readouterr()
    assert path.read_bytes().startswith(b"\x89PNG")
    assert f"drawn in {path}" in err
    assert "drawn" not in out


@pytest.mark.parametrize(
    ("words", "sentence"),
    [
        (["--frame", "99"], "there is no frame 99; frames go from 1 to 20"),
        (["--frame", "10", "--track", "7"], "there is no track 7"),
        (["--frame", "10", "--track", "1", "--line", "20"], "only one of them"),
        (["--frame", "10", "--why-not", "1"], "'why not' needs a track"),
        (["--frame", "10", "--track", "1", "--why-not", "x"], "found 'x'"),
        (["--frame", "10", "--track", "1", "--why-not", "line:"], "found 'line:'"),
        (["--frame", "10", "--picture", "a.gif"], "name it a.png"),
        (["--frame", "10", "--picture", "/dev/null/a.png"], "cannot be written"),
        ([], "frame"),
    ],
)
def test_failures_are_sentences(folder, words, sentence, capsys):
    assert run(["explain", folder, *words]) == 2
    out, err = capsys.readouterr()
    assert out == ""
    assert sentence in err
    assert "Traceback" not in err


def test_no_run(tmp_path, capsys):
    assert run(["explain", str(tmp_path / "none"), "--frame", "1"]) == 2
    assert "is not a run folder" in capsys.readouterr().err


def test_no_ledger(tmp_path, capsys):
    folder = str(made_run(tmp_path / "run", crossing(), *CROSSING, level="none"))
    assert run(["explain", folder, "--frame", "10"]) == 2
    assert "--set ledger.level=full" in capsys.readouterr().err
