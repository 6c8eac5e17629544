"""Lost frames, jitter and late arrivals."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from tracker.simulation.sensors.delivery import deliver
from tracker.simulation.settings import ClockSettings, DeliverySettings
from tracker.simulation.streams import Streams

CLOCK = ClockSettings(seconds=400.0, frame_rate_hz=10.0)
TAIL = 0.001


def test_a_good_line_delivers_every_frame_on_time():
    frames = deliver(CLOCK, DeliverySettings(), Streams(1))
    assert frames.number.tolist() == list(range(1, 4001))
    assert frames.time == pytest.approx(0.1 * np.arange(4000))
    assert frames.arrival is None
    assert frames.scheduled == 4000


def test_single_losses_are_binomial():
    frames = deliver(CLOCK, DeliverySettings(drop_probability=0.2), Streams(1))
    low, high = stats.binom.interval(1 - TAIL, 4000, 0.8)
    assert low <= len(frames) <= high


def test_outages_take_the_stated_share_of_the_time():
    """Exponential outages that may overlap: a frame is fine with exp(-rate x mean length)."""
    chosen = DeliverySettings(outages_per_minute=6.0, outage_seconds=2.0)
    share = np.mean([len(deliver(CLOCK, chosen, Streams(seed))) / 4000 for seed in range(10)])
    # About 400 outages of 2 s in all: relative deviation of the lost time sqrt(2 / 400) = 7%.
    assert 1.0 - share == pytest.approx(1.0 - np.exp(-0.1 * 2.0), rel=0.25)
    gaps = np.diff(deliver(CLOCK, chosen, Streams(1)).number)
    assert gaps.max() > 15  # seconds at a stretch, not single frames


def test_jittered_times_stay_in_order_and_have_the_stated_spread():
    frames = deliver(CLOCK, DeliverySettings(jitter_sigma_seconds=0.01), Streams(2))
    assert np.all(np.diff(frames.time) > 0.0)
    error = frames.time[1:] - 0.1 * np.arange(1, 4000)
    # The sample deviation has a relative deviation of 1 / sqrt(2 n) = 1.1%; cut at 4 sigma.
    assert error.std() == pytest.approx(0.01, rel=0.05)
    wild = deliver(CLOCK, DeliverySettings(jitter_sigma_seconds=5.0), Streams(2))
    assert np.all(np.diff(wild.time) > 0.0)
    assert wild.time.min() >= 0.0


def test_late_frames_overtake_each_other():
    chosen = DeliverySettings(latency_seconds=0.05, late_probability=0.3, late_seconds=0.4)
    frames = deliver(CLOCK, chosen, Streams(3))
    delay = frames.arrival - frames.time
    assert delay.min() == pytest.approx(0.05, abs=1e-6)
    late = delay > 0.05 + 1e-6
    low, high = stats.binom.interval(1 - TAIL, 4000, 0.3)
    assert low <= late.sum() <= high
    assert stats.kstest(delay[late] - 0.05, "expon", args=(0.0, 0.4)).pvalue > TAIL
    assert np.any(np.diff(frames.arrival) < 0.0)
