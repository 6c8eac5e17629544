"""How likely each live track is to be detected, where tracks may hide one another."""

from __future__ import annotations

import numpy as np

from tracker.errors import SettingsError
from tracker.kernels.visibility import visible_shares
from tracker.lifecycle.table import TrackTable
from tracker.log.model import Floats, Kind
from tracker.results.tracks import TrackState
from tracker.settings.schema import Settings

LEAST_SHARE = 0.05  # of P_D: what is hidden by all appearance is detected now and then all the same


class Detectability:
    """P_D of each track: in proportion less where less than a share of its box is visible.

    Raises SettingsError where nothing is a box.
    """

    def __init__(self, settings: Settings, kind: Kind) -> None:
        threshold = settings.sensor.hidden_below
        assert threshold is not None, "without it all tracks are alike"
        if kind is not Kind.BOX:
            raise SettingsError("only boxes hide one another", setting="sensor.hidden_below")
        self._threshold = threshold
        self._detected = settings.sensor.detection_probability
        self._limit = settings.gate.candidate_limit

    def of(self, table: TrackTable) -> Floats:
        """(n,) P_D of the predicted tracks. Only confirmed ones hide others."""
        hides = table.state == TrackState.CONFIRMED
        share = visible_shares(table.mean, hides, self._limit) / self._threshold
        return self._detected * np.clip(share, LEAST_SHARE, 1.0)
