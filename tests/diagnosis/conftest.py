"""Runs that several test files explain, made once."""

from __future__ import annotations

import numpy as np
import pytest

from tests.diagnosis.runs import CROSSING, PINNED, crossing, made_log, made_run, shipped_log


@pytest.fixture(scope="session")
def crossing_run(tmp_path_factory):
    return made_run(tmp_path_factory.mktemp("crossing") / "run", crossing(), *CROSSING)


@pytest.fixture(scope="session")
def crowd_log():
    """Five points that mill about within each other's gates, each seen three times in four."""
    rng = np.random.default_rng(11)
    place = rng.normal(0.0, 0.15, (5, 2))
    frames = {}
    for n in range(1, 31):
        place = 0.95 * place + rng.normal(0.0, 0.03, place.shape)
        seen = place[rng.random(5) < 0.75] + rng.normal(0.0, 0.05, (5, 2))[: len(place)][:1]
        frames[n] = np.concatenate((seen, rng.uniform(-0.4, 0.4, (rng.integers(0, 2), 2))))
    return made_log(frames)


@pytest.fixture(scope="session")
def crowd_run(tmp_path_factory, crowd_log):
    return made_run(tmp_path_factory.mktemp("crowd") / "run", crowd_log, *CROSSING)


@pytest.fixture(scope="session")
def campus_runs(tmp_path_factory):
    """One shipped sequence at both levels of the ledger."""
    folder = tmp_path_factory.mktemp("campus")
    log = shipped_log("TUD-Campus")
    return {
        level: made_run(folder / level, log, *PINNED, level=level)
        for level in ("full", "contested")
    }


@pytest.fixture(scope="session")
def stadtmitte_run(tmp_path_factory):
    folder = tmp_path_factory.mktemp("stadtmitte") / "run"
    return made_run(folder, shipped_log("TUD-Stadtmitte"), *PINNED, level="contested")
