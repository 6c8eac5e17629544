"""An answer that is not proved optimal stops the run, with the component kept for a report."""

import json
import re
import sys
from pathlib import Path

import numpy as np
import pytest

from tracker import Engine, Frame, Kind, Settings
from tracker.cli.main import run
from tracker.errors import EXIT_INTERNAL, CertificateError

SAMPLES = Path(__file__).resolve().parent.parent.parent / "sample_sequences"


@pytest.fixture
def wrong_solver(monkeypatch):
    """A solver whose answers are not optimal: prices a nat too high."""
    module = sys.modules["tracker.association.associate"]
    right = module.solve

    def wrong(problem, want_margins):
        solution = right(problem, want_margins)
        if not len(problem.miss):
            return solution
        answer = solution.answer._replace(row_price=solution.answer.row_price + 1.0)
        return solution._replace(answer=answer, weakest=0, gap=-1.0, violation=1.0)

    monkeypatch.setattr(module, "solve", wrong)


def test_the_engine_stops_and_says_which_component(wrong_solver):
    engine = Engine(Settings(), Kind.POINT)
    engine.step(Frame.of_points(1, 0.0, [[1.0, 1.0]]))
    with pytest.raises(CertificateError, match=r"frame 2: component 0 .* not proved") as caught:
        engine.step(Frame.of_points(2, 0.1, [[1.0, 1.0]]))
    evidence = caught.value.evidence
    assert evidence["pairs"] == {0: 0}
    assert len(evidence["candidates"]) == 1
    assert evidence["frame"] == 2
    assert np.isfinite(evidence["candidates"][0][2])


def test_the_command_ends_with_code_3_and_a_file(wrong_solver, tmp_path, capsys):
    out = tmp_path / "run"
    assert run(["associate", str(SAMPLES / "fog"), "--out", str(out)]) == EXIT_INTERNAL
    told = capsys.readouterr().err
    path = Path(re.search(r"with (\S+\.json)", told).group(1))
    assert {"candidates", "miss", "new", "row_price"} <= set(json.loads(path.read_text()))
    path.unlink()
    assert not out.exists()
