"""`margent calibrate` as a user meets it."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from tracker.cli.main import run
from tracker.settings import load_settings

FOG = Path(__file__).resolve().parents[2] / "sample_sequences" / "fog"
TRUTH = ["--truth", str(FOG / "truth.csv")]


def test_settings_table_and_pictures(tmp_path, capsys):
    out, plots = tmp_path / "fog.toml", tmp_path / "plots"
    words = ["calibrate", str(FOG), *TRUTH, "--out", str(out), "--plots", str(plots)]
    assert run(words) == 0
    captured = capsys.readouterr()
    assert captured.out.splitlines()[0].split()[:2] == ["value", "measured"]
    assert "Mean NIS of the last third" in captured.out
    assert "licensed practice" in captured.err
    # 354 of the 550 annotated rows have a detection (the count of this version).
    assert load_settings(out).sensor.detection_probability == pytest.approx(354 / 550)
    text = out.read_text(encoding="utf-8")
    assert "550 observations; matched share of the truth, Wilson 1927\ndetection_prob" in text
    for name in ("clutter", "scores", "innovations", "detection_size"):
        assert (plots / f"{name}.png").read_bytes().startswith(b"\x89PNG")
    assert run(["calibrate", str(FOG), *TRUTH, "--json"]) == 0
    names = [item["setting"] for item in json.loads(capsys.readouterr().out)["evidence"]]
    assert "measurement.position_sigma" in names


def test_without_truth(capsys):
    assert run(["calibrate", str(FOG), "--self"]) == 0
    assert "own confident tracks" in capsys.readouterr().out


@pytest.mark.parametrize(
    ("words", "sentence"),
    [
        ([], "name the detection logs"),
        ([str(FOG)], "give --truth, or --self"),
        ([str(FOG), "--self", *TRUTH], "not both"),
        ([str(FOG), *TRUTH, *TRUTH], "1 logs but 2 truths"),
    ],
)
def test_wrong_usage(words, sentence, capsys):
    assert run(["calibrate", *words]) == 2
    assert sentence in capsys.readouterr().err
