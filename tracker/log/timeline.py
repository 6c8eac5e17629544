"""Frame numbers and seconds: checks that rows agree on them, and one time axis for a log."""

from __future__ import annotations

import math
from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from tracker.errors import UsageError
from tracker.log.model import Floats, Ints, SequenceFacts
from tracker.log.sieve import Sieve

ASSUMED_RATE_HZ = 25.0
_RATE_MISMATCH = 0.05  # common practice, no source: beyond this someone mixed up two rates
_PLAUSIBLE_STEP = (1e-4, 100.0)  # seconds a frame; outside, the unit is probably wrong


@dataclass(frozen=True, slots=True)
class Timeline:
    """Frames in order, and the rows of each: ``order[offsets[k]:offsets[k + 1]]``.

    `order` indexes the kept rows and is None where they are in order already.
    """

    order: Ints | None
    numbers: Ints  # (F,)
    times: Floats  # (F,) seconds
    offsets: Ints  # (F + 1,)
    rate_hz: float
    rate_source: str
    notes: tuple[str, ...]


def check_order(sieve: Sieve) -> None:
    """Reject rows of a log whose time runs backwards or contradicts its frame number.

    The rows of a log are in the order of measurement, so a time below an earlier one is wrong.
    Where there are frame numbers alone, their order is left to `detection_timeline`.
    """
    numbers = sieve.table.numbers
    if "time" not in numbers:
        return
    kept = np.flatnonzero(sieve.keep)
    time = numbers["time"].values[kept]
    if "frame" in numbers:
        _check_frames_against_times(sieve, kept, numbers["frame"].values[kept], time)
        return
    latest = np.maximum.accumulate(time)
    bad = time < latest
    if not bad.any():
        return
    holder = np.maximum.accumulate(np.where(time == latest, np.arange(len(time)), 0))
    reasons = {
        int(kept[k]): f"time runs backwards ({sieve.line_of(kept[holder[k]])} has {latest[k]:.15g})"
        for k in np.flatnonzero(bad).tolist()
    }
    sieve.reject_rows(kept[bad], "time", reasons.__getitem__)


def _check_frames_against_times(sieve: Sieve, kept: Ints, frame: Floats, time: Floats) -> None:
    frame_step, time_step = np.diff(frame), np.diff(time)
    if np.all((frame_step >= 0) & (time_step >= 0) & ((frame_step > 0) == (time_step > 0))):
        return
    changes = np.flatnonzero((frame_step != 0) | (time_step != 0)) + 1
    bounds = np.concatenate(([0], changes, [len(kept)])).tolist()
    held = 0  # the row that set the current frame and time
    for start, stop in pairwise(bounds[1:]):
        f, t, last_f, last_t = frame[start], time[start], frame[held], time[held]
        line = sieve.line_of(kept[held])
        column = "time"
        if f == last_f:
            if t == last_t:
                continue
            reason = f"contradicts the time of frame {f:.0f} ({line} has {last_t:.15g})"
        elif t < last_t:
            reason = f"time runs backwards ({line} has {last_t:.15g})"
        elif t == last_t:
            reason = f"the time of another frame ({line} has it for frame {last_f:.0f})"
        elif f < last_f:
            column = "frame"
            reason = f"frame number runs against time ({line} has {last_f:.0f})"
        else:
            held = start
            continue
        sieve.reject_rows(kept[start:stop], column, reason)


def check_pairs(sieve: Sieve) -> None:
    """Reject rows of a truth or track file whose frame number and time contradict others.

    Such files may be in any order (object by object), so only the pairs are compared: each
    frame has the time of its first row, and times grow with the frame numbers.
    """
    numbers = sieve.table.numbers
    if not ("time" in numbers and "frame" in numbers):
        return
    kept = np.flatnonzero(sieve.keep)
    frame, time = numbers["frame"].values[kept], numbers["time"].values[kept]
    _, first, group = np.unique(frame, return_index=True, return_inverse=True)
    bad = time != time[first][group]
    if bad.any():
        reasons = {
            int(kept[k]): f"contradicts the time of frame {frame[k]:.0f} "
            f"({sieve.line_of(kept[first[group[k]]])} has {time[first[group[k]]]:.15g})"
            for k in np.flatnonzero(bad).tolist()
        }
        sieve.reject_rows(kept[bad], "time", reasons.__getitem__)
    held = 0
    for k in range(1, len(first)) if np.any(np.diff(time[first]) <= 0) else ():
        if time[first[k]] > time[first[held]]:
            held = k
            continue
        earlier = f"{frame[first[held]]:.0f} is at {time[first[held]]:.15g}"
        sieve.reject_rows(kept[group == k], "time", f"frame number runs against time ({earlier})")


def detection_timeline(sieve: Sieve, facts: SequenceFacts, frame_rate_hz: float | None) -> Timeline:
    """Order the kept rows into frames and give every frame its time in seconds.

    The rate comes from `facts`, else `frame_rate_hz`, else the median step of the times, else
    it is assumed; with frame numbers alone a frame's time is its number divided by the rate.
    """
    numbers = sieve.table.numbers
    notes: list[str] = []
    order = None
    time = numbers["time"].values[sieve.kept] if "time" in numbers else None
    if "frame" in numbers:
        frame = numbers["frame"].values[sieve.kept]
        if np.any(np.diff(frame) < 0):
            order = np.argsort(frame, kind="stable")
            late = int(np.sum(frame < np.maximum.accumulate(frame)))
            notes.append(
                f"{late} {'row was' if late == 1 else 'rows were'} out of order and sorted by frame"
            )
            frame = frame[order]
            time = time if time is None else time[order]
        axis = frame
    else:
        assert time is not None
        axis = time
    offsets = np.concatenate(([0], np.flatnonzero(np.diff(axis) > 0) + 1, [len(axis)]))
    starts = offsets[:-1]
    if "frame" in numbers:
        frame_numbers = frame[starts].astype(np.int64)
    else:
        frame_numbers = np.arange(1, len(starts) + 1, dtype=np.int64)
    given = None if time is None else time[starts]
    rate, source = choose_rate(frame_numbers, given, facts, frame_rate_hz)
    notes += _rate_notes(frame_numbers, given, rate, source)
    return Timeline(
        order,
        frame_numbers,
        frame_numbers / rate if given is None else np.array(given),
        offsets.astype(np.int64),
        rate,
        source,
        tuple(notes),
    )


def frames_of(sieve: Sieve) -> tuple[Ints, Floats | None]:
    """Frame number and time (None without one) of each kept row; times alone are numbered."""
    numbers = sieve.table.numbers
    time = numbers["time"].values[sieve.kept] if "time" in numbers else None
    if "frame" in numbers:
        return numbers["frame"].values[sieve.kept].astype(np.int64), time
    assert time is not None
    _, group = np.unique(time, return_inverse=True)
    return group.astype(np.int64) + 1, time


def choose_rate(
    frames: Ints, times: Floats | None, facts: SequenceFacts, frame_rate_hz: float | None
) -> tuple[float, str]:
    """The frame rate and where it comes from.

    Raises UsageError if `frame_rate_hz` is not a positive number.
    """
    if frame_rate_hz is not None and not (0 < frame_rate_hz < math.inf):
        raise UsageError(f"frame_rate_hz must be greater than 0 (found {frame_rate_hz!r})")
    if facts.frame_rate_hz is not None:
        return facts.frame_rate_hz, "sequence.toml"
    if frame_rate_hz is not None:
        return float(frame_rate_hz), "settings"
    measured = _measured_rate(frames, times)
    if measured is not None:
        return measured, "timestamps"
    return ASSUMED_RATE_HZ, "assumed"


def _measured_rate(frames: Ints, times: Floats | None) -> float | None:
    """Median of frames per second over all steps; missing numbers count as frames."""
    if times is None or len(times) < 2:
        return None
    return float(np.median(np.diff(frames) / np.diff(times)))


def _rate_notes(frames: Ints, times: Floats | None, rate: float, source: str) -> list[str]:
    notes = []
    measured = _measured_rate(frames, times)
    if source == "assumed":
        notes.append(
            f"no frame rate is known, {rate:g} Hz is assumed: set frame_rate_hz in a sequence.toml "
            "beside the log, or give --frame-rate-hz"
        )
    if measured is not None and abs(measured - rate) > _RATE_MISMATCH * rate:
        notes.append(
            f"the timestamps run at {measured:.4g} Hz but {source} says {rate:g} Hz; the "
            "timestamps are used"
        )
    if measured is not None and not (_PLAUSIBLE_STEP[0] <= 1 / measured <= _PLAUSIBLE_STEP[1]):
        notes.append(f"frames are {1 / measured:.3g} s apart: is the time column in seconds?")
    return notes
