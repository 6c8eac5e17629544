"""A run that looked back has two names for a track: the engine's, and the object's in hindsight.

The ledger speaks of the engine's tracks, because it is the engine's decisions that it explains.
"""

from __future__ import annotations

from tracker.diagnosis.ledger_reading import RunLedger
from tracker.results.tracks import TRACKS


def engine_track(ledger: RunLedger, frame: int, track: int, live: bool) -> tuple[int, list[str]]:
    """The engine's name of a track that somebody asks about, and what to say of it.

    live : whether the engine has a track of that name in the frame; then that is the one.
    """
    if not ledger.looked_back:
        return track, []
    rows = ledger.rows(TRACKS, frame, frame, columns=("track", "online_track")).to_pylist()
    if not live:
        for row in rows:
            if row["track"] != track:
                continue
            own = row["online_track"]
            if own is None:
                return track, [
                    f"In hindsight object {track} is here, unseen: its row lies between detections."
                ]
            return own, [f"In hindsight this is object {track}; the engine called it {own}."]
    for row in rows:
        if row["online_track"] == track and row["track"] != track:
            return track, [f"In hindsight this is object {row['track']} (see links.csv)."]
    return track, []
