"""When frames are captured, which of them get lost, and when the others arrive."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tracker.errors import UsageError
from tracker.log.model import Floats, Ints
from tracker.simulation.settings import ClockSettings, DeliverySettings, check_rows
from tracker.simulation.streams import Streams
from tracker.simulation.tables import rounded

TIME_DECIMALS = 6
JITTER_LIMIT = 0.4  # of a frame period: two neighbours cannot change places


@dataclass(frozen=True, slots=True)
class Frames:
    """Delivered frames.

    number : (F,) from 1, gaps where frames were lost.   time : (F,) seconds of capture.
    arrival : (F,) seconds, or None where delivery is instant.   scheduled : frames planned.
    """

    number: Ints
    time: Floats
    arrival: Floats | None
    scheduled: int

    def __len__(self) -> int:
        return len(self.number)


def deliver(clock: ClockSettings, delivery: DeliverySettings, streams: Streams) -> Frames:
    """Draw capture times, losses and delays. Frame k is due at (k - 1) / frame rate.

    Raises UsageError if no frame would be left, or there would be far too many.
    """
    check_rows(clock.seconds * clock.frame_rate_hz, "frames")
    count = round(clock.seconds * clock.frame_rate_hz)
    period = 1.0 / clock.frame_rate_hz
    due: Floats = np.arange(count, dtype=np.float64) * period
    lost = _lost(due, period, delivery, streams)
    if count - np.count_nonzero(lost) < 1:
        raise UsageError("not one frame would be delivered: lengthen the sequence")
    time = due
    if delivery.jitter_sigma_seconds > 0.0:
        jitter = streams("jitter").standard_normal(count) * delivery.jitter_sigma_seconds
        limit = JITTER_LIMIT * period
        time = np.maximum(due + np.clip(jitter, -limit, limit), 0.0)
    time = rounded(time, TIME_DECIMALS)
    arrival = _arrival(time, delivery, streams)
    kept = ~lost
    return Frames(
        number=np.arange(1, count + 1)[kept],
        time=time[kept],
        arrival=None if arrival is None else arrival[kept],
        scheduled=count,
    )


def _lost(
    due: Floats, period: float, delivery: DeliverySettings, streams: Streams
) -> NDArray[np.bool_]:
    """Frames in an outage or lost alone. Outages begin as a Poisson process."""
    lost = streams("drops").random(len(due)) < delivery.drop_probability
    rng = streams("outages")
    if delivery.outages_per_minute <= 0.0:
        return lost
    begin = 0.0
    while begin < len(due) * period:
        begin += rng.exponential(60.0 / delivery.outages_per_minute)
        end = begin + rng.exponential(delivery.outage_seconds)
        lost |= (due >= begin) & (due < end)
    return lost


def _arrival(time: Floats, delivery: DeliverySettings, streams: Streams) -> Floats | None:
    if delivery.latency_seconds <= 0.0 and delivery.late_probability <= 0.0:
        return None
    late = streams("late").random(len(time)) < delivery.late_probability
    delay = streams("delays").exponential(delivery.late_seconds, len(time))
    return rounded(time + delivery.latency_seconds + late * delay, TIME_DECIMALS)
