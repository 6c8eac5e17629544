"""NEES and NIS against published chi-square values and samples of known distribution."""

from __future__ import annotations

import numpy as np
import pytest

from tracker.errors import InputError
from tracker.evaluation import Scope
from tracker.evaluation.consistency import check_run, check_squares, checks_table
from tracker.offline import associate_log
from tracker.settings import Settings, load_settings
from tracker.simulation import simulate


def test_interval_of_the_published_example():
    # Bar-Shalom, Li and Kirubarajan 2001, 50 runs of 2 states: [1.5, 2.6] (from memory;
    # recomputed 1.48444, 2.59122).
    check = check_squares(np.full(50, 2.0), 2)
    assert check.lower == pytest.approx(1.48444, abs=1e-5)
    assert check.upper == pytest.approx(2.59122, abs=1e-5)
    assert check.verdict == "consistent"
    assert check_squares(np.full(50, 2.6), 2).verdict == "optimistic"
    assert check_squares(np.full(50, 1.48), 2).verdict == "pessimistic"


# CHECKS: E[d² | gate] at P_G = 0.99, recomputed there.
@pytest.mark.parametrize(
    ("dimension", "expected"), [(1, 0.92476), (2, 1.90697), (3, 2.89408), (4, 3.88345)]
)
def test_mean_behind_a_gate(dimension, expected):
    check = check_squares(np.ones(3), dimension, 0.99)
    assert check.expected == pytest.approx(expected, abs=1e-5)


# NIST/SEMATECH e-Handbook 1.3.6.7.4: the upper 0.95 quantiles.
@pytest.mark.parametrize(("dimension", "quantile"), [(1, 3.841), (2, 5.991), (4, 9.488)])
def test_the_region_that_holds_95_percent(dimension, quantile):
    squares = np.array([quantile - 0.001, quantile + 0.001])
    assert check_squares(squares, dimension).share_inside == 0.5


@pytest.mark.parametrize("gate", [None, 0.9])
@pytest.mark.parametrize("dimension", [2, 4])
def test_samples_of_the_distribution(dimension, gate):
    rng = np.random.default_rng(4)
    squares = rng.chisquare(dimension, 20_000)
    if gate is not None:
        squares = np.sort(squares)[: int(gate * len(squares))]
    check = check_squares(squares, dimension, gate)
    assert check.verdict == "consistent"
    assert check.share_inside == pytest.approx(0.95, abs=0.006)  # four standard errors


def test_no_rows():
    check = check_squares(np.zeros(0), 2)
    assert (check.mean, check.verdict) == (None, "no rows")
    assert "no rows" in checks_table({"a": {"nees": check}})


def test_a_run(tmp_path):
    sequence = simulate("forecourt", seed=3)
    associate_log(sequence.log(), Settings(), tmp_path / "run")
    checks = check_run(tmp_path / "run", sequence.truth())
    assert checks["nees"].rows > 500
    assert checks["nis"].rows > 500
    assert checks["nees"].dimension == 4
    # A filter that thinks its detector ten times better believes itself too much.
    usual = Settings().measurement
    sure = (
        f"measurement.position_sigma={usual.position_sigma / 10}",
        f"measurement.size_sigma={usual.size_sigma / 10}",
    )
    bold = load_settings(None, sure)
    associate_log(sequence.log(), bold, tmp_path / "bold")
    found = check_run(tmp_path / "bold", sequence.truth())
    assert found["nees"].verdict == "optimistic"
    assert found["nees"].mean > 3 * checks["nees"].mean


def test_without_a_ledger_there_is_no_nis(tmp_path):
    sequence = simulate("fog", seed=3)
    settings = load_settings(None, ("ledger.level=none",))
    associate_log(sequence.log(), settings, tmp_path / "run")
    assert list(check_run(tmp_path / "run", sequence.truth())) == ["nees"]


def test_points(tmp_path):
    sequence = simulate("yard", seed=3)
    associate_log(sequence.log(), Settings(), tmp_path / "run")
    checks = check_run(tmp_path / "run", sequence.truth(), Scope(distance_threshold=5.0))
    assert checks["nees"].dimension == 2
    assert checks["nees"].rows > 100


def test_no_run(tmp_path):
    with pytest.raises(InputError, match="not a run folder"):
        check_run(tmp_path, simulate("forecourt", seed=1).truth())
