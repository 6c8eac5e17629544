"""From what is there to what is detected: which objects, how exactly, how sure, as what."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.special import expit

from tracker.log.model import Codes, Floats, Ints
from tracker.simulation.settings import (
    DetectionSettings,
    EmbeddingSettings,
    LabelSettings,
    ScoreSettings,
)
from tracker.simulation.streams import Streams, correlated_normals, happens


def detection_probability(visibility: Floats, size: Floats, settings: DetectionSettings) -> Floats:
    """(n,) P_D of objects with these visible shares and sizes.

    P_D = probability x L(visibility) / L(1) x size^4 / (size^4 + size_half^4) with the logistic
    curve L(v) = 1 / (1 + exp(-(v - visibility_half) / visibility_slope)).
    """
    slope, half = settings.visibility_slope, settings.visibility_half
    seen = expit((visibility - half) / slope) / expit((1.0 - half) / slope)
    large = np.ones_like(size)
    if settings.size_half > 0.0:
        large = 1.0 / (1.0 + (settings.size_half / np.maximum(size, 1e-9)) ** 4)
    return settings.probability * seen * large


def detected(
    probability: Floats,
    owner: Ints,
    time: Floats,
    settings: DetectionSettings,
    streams: Streams,
) -> NDArray[np.bool_]:
    """(n,) which of the rows are detected."""
    normals = correlated_normals(
        streams("detection"), owner, time, settings.miss_correlation_seconds, 1
    )
    return happens(probability, normals[:, 0])


def object_scores(visibility: Floats, settings: ScoreSettings, streams: Streams) -> Floats:
    """(n,) scores of detected objects."""
    mean = settings.object_mean - settings.visibility_gain * (1.0 - visibility)
    normals = streams("object scores").standard_normal(len(visibility))
    return expit(mean + settings.object_sigma * normals)


def clutter_scores(count: int, settings: ScoreSettings, streams: Streams) -> Floats:
    """(count,) scores of clutter."""
    normals = streams("clutter scores").standard_normal(count)
    return expit(settings.clutter_mean + settings.clutter_sigma * normals)


def confused(label: Codes, kinds: int, settings: LabelSettings, streams: Streams) -> Codes:
    """(n,) labels, some of them replaced by one of the others."""
    draws = streams("labels").random((len(label), 2))
    wrong = draws[:, 0] < settings.error_probability
    shift = 1 + (draws[:, 1] * max(kinds - 1, 1)).astype(np.int32)
    return np.where(wrong & (kinds > 1), (label + shift) % kinds, label).astype(np.int32)


def embeddings(
    owner: Ints, objects: int, clutter: int, settings: EmbeddingSettings, streams: Streams
) -> NDArray[np.float32] | None:
    """(n + clutter, k) unit vectors: of detections of objects `owner` (n,), then of clutter.

    An object has a random direction o; its detection is a o + sqrt(1 - a²) e with a random
    direction e at right angles to o, so that two detections have cosine a² = same_cosine on
    average. Clutter has no object and each piece its own direction.
    """
    if settings.dimension == 0:
        return None
    rng = streams("embeddings")
    direction = _directions(rng.standard_normal((objects, settings.dimension)))[owner]
    other = streams("embedding noise").standard_normal((len(owner), settings.dimension))
    other -= (other * direction).sum(axis=1, keepdims=True) * direction
    a = np.sqrt(settings.same_cosine)
    vectors = a * direction + np.sqrt(1.0 - a * a) * _directions(other)
    strange = streams("clutter embeddings").standard_normal((clutter, settings.dimension))
    return np.concatenate((vectors, _directions(strange))).astype(np.float32)


def _directions(vectors: Floats) -> Floats:
    length = np.sqrt((vectors**2).sum(axis=1, keepdims=True))
    return vectors / np.maximum(length, 1e-12)
