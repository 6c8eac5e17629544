"""Why a track was not given the detection that somebody expected."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from tracker.diagnosis.explanation import Alternative, WhyNot
from tracker.diagnosis.frame_record import some_of
from tracker.diagnosis.inquiry import Inquiry
from tracker.diagnosis.words import changes_words, detection_name, gate_words, nats, odds
from tracker.errors import InputError
from tracker.results.tracks import TrackState


def why_not(inquiry: Inquiry, track: int, detection: int) -> WhyNot:
    """Explain one pair. Raises InputError for a track that never was."""
    record = inquiry.record
    found = WhyNot(track, detection, record.line_of(detection), "", "")
    if record.row_of(track) is None:
        return replace(found, verdict="not live", reason=_not_live(inquiry, track))
    tiers = _both_took_part(inquiry, track, detection)
    if not tiers:
        return _never_met(inquiry, found)
    for tier in tiers:
        own = next(r for r in inquiry.rows_of(track=track) if record.decisions.tier[r] == tier)
        contest = inquiry.contest(int(own))
        candidates = contest.candidates_of(track=track, detection=detection)
        if not len(candidates):
            continue
        option = inquiry.pair(contest, tier, int(candidates[0]))
        if option.chosen:
            reason = "it was chosen; there is nothing to explain away"
            return replace(
                found, verdict="chosen", reason=reason, gate=option.gate, alternative=option
            )
        return replace(
            found,
            verdict="worse",
            reason=_worse(inquiry, option),
            gate=option.gate,
            alternative=option,
        )
    gate = inquiry.gate(tiers[-1], track, detection)
    return replace(found, verdict="outside gate", reason=gate_words(gate), gate=gate)


def track_span(inquiry: Inquiry, track: int) -> str:
    """When a track lived. Raises InputError, naming the ids there are, if it never did."""
    life = inquiry.life(track)
    if life.born is None:
        highest = inquiry.ledger.facts["counts"].get("tracks_born", 0)
        raise InputError(
            f"there is no track {track}; ids go from 1 to {highest}"
            if highest
            else f"there is no track {track}: the run has no tracks",
            path=inquiry.ledger.folder,
            remedy=f"Live in frame {inquiry.record.number}: "
            f"{some_of(inquiry.record.track.tolist())}.",
        )
    if life.ended is None:
        return f"born in frame {life.born}, live until the run's end"
    return f"born in frame {life.born}, ended in frame {life.ended} ({life.events[-1].reason})"


def _not_live(inquiry: Inquiry, track: int) -> str:
    number = inquiry.record.number
    span = track_span(inquiry, track)
    life = inquiry.life(track)
    assert life.born is not None
    if life.born == number:
        return "the track was only born in this frame, after its pairs had been decided"
    if life.born > number:
        return f"the track did not exist yet: {span}"
    if life.ended == number:
        return "the track ended in this frame, before its detections were looked at: " + span
    return f"the track no longer existed: {span}"


def _both_took_part(inquiry: Inquiry, track: int, detection: int) -> list[int]:
    tiers = inquiry.record.decisions.tier
    own = tiers[inquiry.rows_of(track=track)]
    return np.intersect1d(own, tiers[inquiry.rows_of(detection=detection)]).tolist()


def _worse(inquiry: Inquiry, option: Alternative) -> str:
    record = inquiry.record
    assert option.gate is not None
    said = f"it was a candidate, {gate_words(option.gate)}"
    if option.held_by is not None:
        said += f"; track {option.held_by} was given the detection"
    if option.force_cost is None:
        return said + "; its cost cannot be told, see the notes"
    said += f". It costs {nats(option.cost)} nats. "
    if option.force_cost < 0.005:
        said += "An answer with it is exactly as good: a tie, settled by the order of the ids"
    else:
        said += (
            f"The best answer with it is {nats(option.force_cost)} nats worse "
            f"({odds(option.force_cost)})"
        )
    return f"{said}: {changes_words(option.changes, record.line_of)}"


def _never_met(inquiry: Inquiry, found: WhyNot) -> WhyNot:
    """No tier saw both: say for each why, and what the gate would have said."""
    record = inquiry.record
    said = []
    paired = False
    for tier, rule in enumerate(inquiry.rules.tiers):
        reasons = []
        if not _took_part(inquiry, tier, track=found.track):
            given = record.given(found.track)
            if given is not None and _tier_of_pair(inquiry, track=found.track) < tier:
                name = detection_name(given, record.line_of(given))
                reasons.append(f"the track had already been given {name}")
                paired = True
            else:
                states = [s.word for s in TrackState if rule.states >> s & 1]
                row = record.row_of(found.track)
                assert row is not None
                reasons.append(
                    f"it takes tracks that are {' or '.join(states)}, this one was "
                    f"{record.state[row]}"
                )
        if not _took_part(inquiry, tier, detection=found.detection):
            holder = record.given_to(found.detection)
            if holder is not None and _tier_of_pair(inquiry, detection=found.detection) < tier:
                reasons.append(f"the detection had already been given to track {holder}")
                paired = True
            else:
                reasons.append(
                    f"the detection's score {record.score[found.detection]:g} is outside its range "
                    f"({_score_range(rule.score_from, rule.score_below)})"
                )
        said.append(f"tier '{rule.name}': " + " and ".join(reasons))
    tiers = inquiry.record.decisions.tier[inquiry.rows_of(track=found.track)]
    gate = inquiry.gate(int(tiers[0]) if len(tiers) else 0, found.track, found.detection)
    return replace(
        found,
        verdict="already paired" if paired else "different tiers",
        reason="no tier looked at both: "
        + "; ".join(said)
        + f". The pair itself was {gate_words(gate)}",
        gate=gate,
    )


def _took_part(
    inquiry: Inquiry, tier: int, *, track: int | None = None, detection: int | None = None
) -> bool:
    own = inquiry.rows_of(track=track, detection=detection)
    return bool((inquiry.record.decisions.tier[own] == tier).any())


def _tier_of_pair(
    inquiry: Inquiry, *, track: int | None = None, detection: int | None = None
) -> int:
    rows = inquiry.record.decisions
    own = inquiry.rows_of(track=track, detection=detection)
    return int(rows.tier[own[rows.decision[own] == "pair"]][0])


def _score_range(low: float, high: float) -> str:
    parts = []
    if np.isfinite(low):
        parts.append(f"at least {low:g}")
    if np.isfinite(high):
        parts.append(f"below {high:g}")
    return " and ".join(parts)
