"""Which frames a page holds."""

import numpy as np

from tracker.report.thinning import WINDOW, frames_kept

FRAMES = np.arange(10_000)
ROWS = np.full(10_000, 10)
NONE = np.empty(0, np.int64)


def test_everything_if_it_fits():
    assert frames_kept(FRAMES, ROWS, NONE, NONE, budget=100_000).all()


def test_errors_at_full_rate_the_rest_thinned_within_the_budget():
    kept = frames_kept(FRAMES, ROWS, np.array([5_000]), np.array([8_000]), budget=10_000)
    for moment in (5_000, 8_000):
        assert kept[moment - WINDOW : moment + WINDOW + 1].all()
    assert ROWS[kept].sum() <= 10_000
    assert kept[:1_000].any()
    assert not kept[:1_000].all()


def test_more_errors_than_fit_stay_within_the_budget():
    kept = frames_kept(FRAMES, ROWS, FRAMES, FRAMES, budget=10_000)
    assert ROWS[kept].sum() <= 10_000
