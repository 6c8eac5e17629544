"""Slow twins of kernels/lifecycle.py: one track at a time, states and reasons as words."""

import math


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


def advance_by_evidence(state, age, paired, evidence, confirm_at, drop_at, undecided_frames):
    """(next state, age, evidence, reason) of one track; `evidence` is that after the frame."""
    age += 1
    kept = min(evidence, confirm_at)
    if evidence <= drop_at:
        return "ended", age, kept, "evidence gone"
    if state == "tentative":
        if paired and evidence >= confirm_at:
            return "confirmed", age, kept, "evidence reached"
        if age >= undecided_frames:
            return "ended", age, kept, "undecided"
        return "tentative", age, kept, "unchanged"
    if paired:
        return "confirmed", age, kept, "found again" if state == "coasting" else "unchanged"
    return "coasting", age, kept, "missed" if state == "confirmed" else "unchanged"


def gather_evidence(evidence, rows, row_candidate, cost, miss):
    """The tracks' evidence after a tier."""
    out = list(evidence)
    for k, i in enumerate(rows):
        out[i] -= miss[k] if row_candidate[k] < 0 else cost[row_candidate[k]]
    return out


def take_over(score, label, pairing, detection_score, detection_label):
    """(scores, labels) of the tracks after taking them over from their detections."""
    new_score, new_label = list(score), list(label)
    for i, j in enumerate(pairing):
        if j >= 0:
            new_score[i] = detection_score[j]
            if new_label[i] < 0:
                new_label[i] = detection_label[j]
    return new_score, new_label


def weigh(confidence, rows, margin):
    """Confidences (not logs) times the odds of each decision as a probability."""
    out = list(confidence)
    for i, nats in zip(rows, margin, strict=True):
        odds = math.exp(nats) if nats < 700 else math.inf
        out[i] *= 1.0 if odds == math.inf else odds / (1.0 + odds)
    return out
