"""The README's Python examples run as they stand."""

import doctest
from pathlib import Path

ROOT = Path(__file__).resolve().parent.parent


def test_examples(monkeypatch):
    monkeypatch.chdir(ROOT)
    failed, tried = doctest.testfile(
        str(ROOT / "README.md"), module_relative=False, optionflags=doctest.NORMALIZE_WHITESPACE
    )
    assert tried >= 10
    assert failed == 0


def test_the_first_paragraph_states_the_job():
    heading, _, paragraph, *_ = (ROOT / "README.md").read_text(encoding="utf-8").split("\n")
    assert heading == "# Margent"
    assert paragraph.startswith("Margent turns detections without identity")
