"""Slow twins of kernels/lifecycle.py: one track at a time, states and reasons as words."""


def expire(last_seen, now, coast_seconds):
    """Whether a track is past its coasting limit (to the microsecond)."""
    return now - last_seen > coast_seconds + 1e-6


def advance(state, hits, age, paired, confirm_hits, confirm_window):
    """(next state, hits, age, reason) of one track; `hits` and `age` are those before."""
    age += 1
    hits += paired
    if state == "tentative":
        if hits >= confirm_hits and paired:
            return "confirmed", hits, age, "hits reached"
        if hits + max(0, confirm_window - age) < confirm_hits:
            return "ended", hits, age, "hits out of reach"
        return "tentative", hits, age, "unchanged"
    if paired:
        return "confirmed", hits, age, "found again" if state == "coasting" else "unchanged"
    return "coasting", hits, age, "missed" if state == "confirmed" else "unchanged"
