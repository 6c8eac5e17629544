"""A whole log looked back on: cut, link, smooth and fill, one call a stage, in order."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

import numpy as np

from tracker.hindsight.chains import join
from tracker.hindsight.cutting import cut_in_doubt
from tracker.hindsight.linking import Links, link_pieces
from tracker.hindsight.noise import likeliest_noise, position_likelihood
from tracker.hindsight.pieces import Collector, Pieces, Scans
from tracker.hindsight.rows import smoothed_rows
from tracker.hindsight.smoothing import Smoothable, batches, smoothable
from tracker.hindsight.stabilise import CommonFrame, measure_common_motion
from tracker.log.model import DetectionLog, Floats, Ints
from tracker.motion import motion_model
from tracker.results.recorder import TrackRows, no_rows
from tracker.settings import Settings


@dataclass(frozen=True, slots=True, eq=False)
class Hindsight:
    """What a log looks like once it is over.

    pieces : what the engine held together, cut where identity was decided anew.
    chains : the same detections by object.   links : what was weighed and decided.
    common : the frame in which positions were compared.   noise : [motion] as used here.
    """

    scans: Scans
    pieces: Pieces
    chains: Pieces
    links: Links | None
    common: CommonFrame
    settings: Settings
    model: Smoothable

    def facts(self) -> dict[str, Any]:
        """What run.json says of it."""
        links = self.links
        nothing = np.empty(0, np.bool_)
        chosen, own, made = (
            (nothing,) * 3 if links is None else (links.chosen, links.own, links.made)
        )
        return {
            "pieces": len(self.pieces),
            "objects": len(self.chains),
            "candidate_links": len(chosen),
            "links_made": int((made & ~own).sum()),
            "joined_again": int((made & own).sum()),
            "links_too_doubtful": int((chosen & ~made).sum()),
            "largest_gap": 0.0 if links is None else abs(links.solution.gap),
            "sensor_moved": bool(np.any(self.common.maps != self.common.maps[:1])),
            "acceleration_noise": self.settings.motion.acceleration_noise,
            "size_noise": self.settings.motion.size_noise,
        }


def check_hindsight(settings: Settings, log: DetectionLog) -> None:
    """Raises SettingsError if the settings' motion model cannot look back."""
    smoothable(motion_model(settings, log.kind))


def look_back(
    log: DetectionLog,
    collected: Collector,
    settings: Settings,
    born: int,
    known: CommonFrame | None = None,
) -> Hindsight:
    """Decide the identities anew.

    log : what the engine saw.   collected : what it decided.   born : its highest id.
    known : a common frame from elsewhere, such as the engine's estimate of its camera's motion;
    it is used if it predicts the log's own tracks better than others.

    Raises SettingsError for a motion model that cannot smooth, CertificateError if the links are
    not proved optimal.
    """
    how = settings.hindsight
    scans, tracks = collected.finish()
    common, settings = _common_frame(log, tracks, scans, settings, known)
    model = smoothable(motion_model(settings, log.kind))
    z, variance = in_common_frame(log, tracks, common, model)
    if not len(tracks) or how.link_seconds == 0.0 or len(scans.time) < 2:
        return Hindsight(scans, tracks, tracks, None, common, settings, model)
    pieces = cut_in_doubt(tracks, scans, how.cut_seconds, how.cut_margin)
    links = link_pieces(pieces, log, scans, common, model, settings, z, variance)
    chains = join(pieces, links, born)
    return Hindsight(scans, pieces, chains, links, common, settings, model)


def _common_frame(
    log: DetectionLog,
    tracks: Pieces,
    scans: Scans,
    settings: Settings,
    known: CommonFrame | None,
) -> tuple[CommonFrame, Settings]:
    """The frame that predicts the log's own tracks better, and settings with the noise there.

    A sensor that stands still is believed to, if its measured motion does not predict better.
    """
    how = settings.hindsight
    still = CommonFrame.still(len(scans.time))
    choices = [still]
    if how.common_motion == "measured" and len(tracks):
        choices.append(measure_common_motion(tracks, len(scans.time), log.z))
    if known is not None:
        choices.append(known)
    found: list[tuple[CommonFrame, Settings]] = []
    likelihoods = []
    for common in choices if len(tracks) else []:
        model = smoothable(motion_model(settings, log.kind))
        judged = (settings, log.kind, tracks, scans, *in_common_frame(log, tracks, common, model))
        if how.noise == "measured":
            own, likelihood = likeliest_noise(*judged)
        else:
            own = settings
            likelihood = position_likelihood(*judged) if len(choices) > 1 else 0.0
        found.append((common, own))
        likelihoods.append(likelihood)
    return found[int(np.argmax(likelihoods))] if found else (still, settings)


def in_common_frame(
    log: DetectionLog, pieces: Pieces, common: CommonFrame, model: Smoothable
) -> tuple[Floats, Floats]:
    """(N, d) measurements and variances of the log's rows; rows of no piece stay as they are."""
    z = log.z.copy()
    variance = model.measurement_variance(log.z, log.sigma)
    z[pieces.row] = common.forth(log.z[pieces.row], pieces.scan)
    variance[pieces.row] *= common.scale(pieces.scan)[:, None] ** 2
    return z, variance


def rows_in_hindsight(
    log: DetectionLog, found: Hindsight, settings: Settings
) -> tuple[TrackRows, Ints]:
    """Every object in every scan from its first to its last detection, sorted by (frame, track).

    Also returns the engine's track of each row, -1 for a row without a detection.
    """
    if not len(found.chains):
        return no_rows(log.kind), np.empty(0, np.int64)
    z, variance = in_common_frame(log, found.chains, found.common, found.model)
    parts = list(_parts(log, found, settings, z, variance))
    rows = TrackRows.join([part for part, _ in parts])
    online = np.concatenate([own for _, own in parts])
    order = np.lexsort((rows.track, rows.frame))
    ordered = TrackRows(*(getattr(rows, name)[order] for name in TrackRows.__slots__))
    return ordered, online[order]


def _parts(
    log: DetectionLog, found: Hindsight, settings: Settings, z: Floats, variance: Floats
) -> Iterator[tuple[TrackRows, Ints]]:
    for numbers in batches(found.chains):
        wanted = np.zeros(len(found.chains), np.bool_)
        wanted[numbers] = True
        yield smoothed_rows(
            log,
            found.chains.only(wanted),
            found.scans,
            found.common,
            found.model,
            settings,
            z,
            variance,
        )
