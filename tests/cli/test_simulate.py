"""`margent simulate` as a user meets it."""

from __future__ import annotations

import sys

import pytest

from tracker.cli.main import run
from tracker.simulation import SCENES


def test_scenes_are_listed(capsys):
    assert run(["simulate", "--scenes"]) == 0
    out = capsys.readouterr().out
    assert [line.split()[0] for line in out.splitlines()] == list(SCENES)


def test_a_sequence_is_written_and_summed_up(tmp_path, capsys):
    folder = tmp_path / "fog"
    assert run(["simulate", "fog", "--seed", "3", "--seconds", "1", "--out", str(folder)]) == 0
    assert sorted(item.name for item in folder.iterdir()) == [
        "detections.csv", "sequence.toml", "truth.csv",
    ]  # fmt: skip
    captured = capsys.readouterr()
    assert captured.out == ""
    assert captured.err.startswith("fog: 12 frames, ")
    assert captured.err.rstrip().endswith(f"objects in {folder}")


def test_the_folder_is_named_after_scene_and_seed(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    assert run(["simulate", "yard", "--seed", "5", "--seconds", "1"]) == 0
    assert (tmp_path / "yard-5" / "truth_oriented.csv").is_file()


def test_the_same_command_gives_the_same_bytes(tmp_path):
    for name in ("a", "b"):
        assert run(["simulate", "outage", "--seconds", "2", "--out", str(tmp_path / name)]) == 0
    for item in (tmp_path / "a").iterdir():
        assert item.read_bytes() == (tmp_path / "b" / item.name).read_bytes()


def test_settings_are_printed_changed_and_read_again(tmp_path, capsys):
    assert (
        run(["simulate", "harbour", "--set", "radar.clutter_per_scan=3", "--print-settings"]) == 0
    )
    text = capsys.readouterr().out
    assert "# Mean number of sea clutter detections a scan" in text
    assert "clutter_per_scan = 3.0" in text
    file = tmp_path / "calm.toml"
    file.write_text(text, encoding="utf-8")
    words = ["simulate", "harbour", "--settings", str(file), "--seconds", "20"]
    assert run([*words, "--out", str(tmp_path / "calm")]) == 0
    facts = (tmp_path / "calm" / "sequence.toml").read_text(encoding="utf-8")
    assert "--set clock.seconds=20.0 --set radar.clutter_per_scan=3.0" in facts


@pytest.mark.parametrize(
    ("words", "sentence"),
    [
        ([], "name a scene: forecourt, rush, fog, yard, harbour, sway, outage, scale"),
        (["forcourt"], "there is no scene 'forcourt'"),
        (["fog", "--seconds", "-1"], "clock.seconds: expected `float` > 0.0"),
        (["fog", "--seconds", "soon"], "--seconds"),
        (["fog", "--seed", "-1"], "--seed"),
        (["fog", "--set", "fleet.stops=2"], "this scene has no setting 'fleet'"),
        (["fog", "--settings", "none.toml"], "the settings file cannot be read"),
        (["fog", "--video", "film.avi"], "name it film.mp4"),
    ],
)
def test_wrong_use_is_a_sentence_and_exit_code_2(words, sentence, capsys, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    assert run(["simulate", *words]) == 2
    captured = capsys.readouterr()
    assert sentence in captured.err
    assert "Traceback" not in captured.err
    assert list(tmp_path.iterdir()) == []


def test_a_folder_of_ones_own_is_not_overwritten(tmp_path, capsys):
    (tmp_path / "mine.csv").write_text("1", encoding="utf-8")
    assert run(["simulate", "fog", "--seconds", "1", "--out", str(tmp_path)]) == 2
    assert "choose another --out" in capsys.readouterr().err
    assert (tmp_path / "mine.csv").read_text(encoding="utf-8") == "1"


def test_a_video_may_lie_in_the_folder_and_the_command_be_repeated(tmp_path):
    pytest.importorskip("cv2")
    folder = tmp_path / "yard"
    words = ["simulate", "yard", "--seconds", "0.5", "--out", str(folder)]
    for _ in range(2):
        assert run([*words, "--video", str(folder / "film.mp4")]) == 0
    assert (folder / "film.mp4").stat().st_size > 1000


def test_without_opencv_only_the_video_is_refused(tmp_path, monkeypatch, capsys):
    monkeypatch.setitem(sys.modules, "cv2", None)
    words = ["simulate", "yard", "--seconds", "0.5", "--out", str(tmp_path / "yard")]
    assert run(words) == 0
    assert run([*words, "--video", str(tmp_path / "film.mp4")]) == 2
    assert "pip install opencv-python-headless" in capsys.readouterr().err
