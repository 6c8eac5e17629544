"""Intervals against published values."""

from __future__ import annotations

import pytest

from tracker.calibration.intervals import count_interval, share_interval


def test_wilson():
    # Newcombe 1998, Statistics in Medicine 17, table I, method 3 (from memory): 81 of 263.
    assert share_interval(81, 263) == pytest.approx((0.2553, 0.3662), abs=5e-5)
    assert share_interval(0, 20) == pytest.approx((0.0, 0.1611), abs=5e-5)


def test_garwood():
    # Garwood 1936, Biometrika 28, as tabulated everywhere (from memory): 0 and 10 events.
    assert count_interval(0) == pytest.approx((0.0, 3.689), abs=5e-4)
    assert count_interval(10) == pytest.approx((4.795, 18.390), abs=5e-4)
