"""The part of sensing that all sensors share: detect, disturb, score, label, mix with clutter."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tracker.errors import SettingsError
from tracker.log.model import Codes, Floats, Ints
from tracker.simulation.sensors.delivery import Frames
from tracker.simulation.sensors.detector import (
    clutter_scores,
    confused,
    detected,
    embeddings,
    object_scores,
)
from tracker.simulation.sequence import CLUTTER, TrueObjects
from tracker.simulation.settings import SceneSettings
from tracker.simulation.streams import Streams, correlated_normals
from tracker.simulation.tables import SCORE_DECIMALS, rounded

EMBEDDING_DECIMALS = 3


@dataclass(frozen=True, slots=True, eq=False)
class Clutter:
    """False detections in the sensor's own measurement space.

    frame : (n,) index into the frames, sorted.   measured : (n, d).   label : (n,) codes.
    """

    frame: Ints
    measured: Floats
    label: Codes


@dataclass(frozen=True, slots=True, eq=False)
class Sensed:
    """Detections in the sensor's own measurement space, sorted by (frame, falling score).

    frame, score, label, origin, embedding : as in `Detections`.   measured : (n, d).
    """

    frame: Ints
    measured: Floats
    score: Floats
    label: Codes
    origin: Ints
    embedding: NDArray[np.float32] | None


def sense(
    true: TrueObjects,
    exact: Floats,
    sigma: Floats,
    clutter: Clutter,
    settings: SceneSettings,
    frames: Frames,
    kinds: int,
    streams: Streams,
    *,
    correlation_seconds: float = 0.0,
) -> Sensed:
    """Detect objects with `true.probability`, add Gaussian noise, and mix with clutter.

    exact, sigma : (n, d) true measurement and standard deviation of its noise.
    kinds : number of labels.   correlation_seconds : time constant of the noise.

    Everything random is drawn for every object in view, detected or not, so that a changed
    detection probability leaves noise, scores and labels as they were.

    Raises SettingsError for an embedding of dimension 1.
    """
    if settings.embedding.dimension == 1:
        raise SettingsError("must be 0 or at least 2 (found 1)", setting="embedding.dimension")
    time = frames.time[true.frame]
    hit = detected(true.probability, true.object, time, settings.detection, streams)
    normals = correlated_normals(
        streams("noise"), true.object, time, correlation_seconds, exact.shape[1]
    )
    score = object_scores(true.visibility, settings.scores, streams)
    label = confused(true.label, kinds, settings.labels, streams)
    false = len(clutter.frame)
    objects = int(true.object.max(initial=0)) + 1
    vectors = embeddings(true.object, objects, false, settings.embedding, streams)
    if vectors is not None:
        vectors = np.round(vectors[np.append(hit, np.ones(false, bool))], EMBEDDING_DECIMALS)
    return _sorted(
        Sensed(
            frame=np.concatenate((true.frame[hit], clutter.frame)),
            measured=np.concatenate(((exact + sigma * normals)[hit], clutter.measured)),
            score=rounded(
                np.concatenate((score[hit], clutter_scores(false, settings.scores, streams))),
                SCORE_DECIMALS,
            ),
            label=np.concatenate((label[hit], clutter.label)).astype(np.int32),
            origin=np.concatenate((true.object[hit], np.full(false, CLUTTER))),
            embedding=vectors,
        )
    )


def _sorted(rows: Sensed) -> Sensed:
    """The order says nothing about identity: frame, falling score, then first coordinate."""
    order = np.lexsort((rows.measured[:, 0], -rows.score, rows.frame))
    return Sensed(
        rows.frame[order],
        rows.measured[order],
        rows.score[order],
        rows.label[order],
        rows.origin[order],
        None if rows.embedding is None else rows.embedding[order],
    )
