"""Costs of candidates, in nats: minus the log-likelihood ratio of 'same object' against 'new'."""

from __future__ import annotations

import numpy as np
from numba import njit
from numpy.typing import NDArray

LOG_TWO_PI = 1.8378770664093453


@njit(cache=True)
def overlap_term(overlap: NDArray[np.float64], nats: float, neutral: float) -> NDArray[np.float64]:
    """(E,) nats · (neutral − IoU)."""
    out = np.empty(len(overlap))
    for e in range(len(overlap)):
        out[e] = nats * (neutral - overlap[e])
    return out


@njit(cache=True)
def mahalanobis_term(distance: NDArray[np.float64], threshold: float) -> NDArray[np.float64]:
    """(E,) ½ (d² − γ): neutral at the edge of the gate."""
    out = np.empty(len(distance))
    for e in range(len(distance)):
        out[e] = 0.5 * (distance[e] - threshold)
    return out


@njit(cache=True)
def likelihood_term(
    distance: NDArray[np.float64],
    log_volume: NDArray[np.float64],
    z: NDArray[np.float64],
    column: NDArray[np.int64],
    scaled: bool,
    log_new_density: float,
) -> NDArray[np.float64]:
    """(E,) ½ d² + ½ ln det(2πS) + ln λ_new (Sittler 1964; Blackman and Popoli 1999).

    z : (m, d) detections, column[e] that of pair e.   scaled : whether λ_new counts lengths in
    box scales, √(w h) of the detection, and not in the log's unit: d of them make a volume.
    """
    d = z.shape[1]
    out = np.empty(len(distance))
    for e in range(len(distance)):
        log_likelihood = -0.5 * (distance[e] + log_volume[e] + d * LOG_TWO_PI)
        out[e] = log_new_density - log_likelihood
        if scaled:
            out[e] -= 0.5 * d * np.log(z[column[e], 2] * z[column[e], 3])
    return out


@njit(cache=True)
def label_term(
    track_label: NDArray[np.int32],
    detection_label: NDArray[np.int32],
    agree_nats: float,
    differ_nats: float,
) -> NDArray[np.float64]:
    """(E,) −agree_nats for equal labels, differ_nats for others, 0 if one is unknown (-1)."""
    out = np.empty(len(track_label))
    for e in range(len(track_label)):
        if track_label[e] < 0 or detection_label[e] < 0:
            out[e] = 0.0
        else:
            out[e] = -agree_nats if track_label[e] == detection_label[e] else differ_nats
    return out


@njit(cache=True)
def appearance_term(
    track_embedding: NDArray[np.float32],
    row: NDArray[np.int64],
    detection_embedding: NDArray[np.float32],
    column: NDArray[np.int64],
    nats: float,
    neutral: float,
) -> NDArray[np.float64]:
    """(E,) nats · (neutral − cosine similarity) of track row[e] and detection column[e].

    track_embedding : (n, k) running means, detection_embedding : (m, k); neither need be of unit
    length. A zero vector says nothing: its term is 0.
    """
    out = np.empty(len(row))
    for e in range(len(row)):
        dot = 0.0
        own = 0.0
        other = 0.0
        for c in range(track_embedding.shape[1]):
            a = float(track_embedding[row[e], c])
            b = float(detection_embedding[column[e], c])
            dot += a * b
            own += a * a
            other += b * b
        if own > 0.0 and other > 0.0:
            out[e] = nats * (neutral - dot / np.sqrt(own * other))
        else:
            out[e] = 0.0
    return out


@njit(cache=True)
def blend_embeddings(
    track_embedding: NDArray[np.float32],
    pairing: NDArray[np.int64],
    detection_embedding: NDArray[np.float32],
    memory: float,
) -> None:
    """Running mean of unit vectors, in place: e ← memory · e + (1 − memory) · z / |z|.

    track_embedding : (n, k).   pairing : (n,) detection of each track, -1 for none.
    """
    for i in range(len(pairing)):
        j = pairing[i]
        if j < 0:
            continue
        length = 0.0
        for c in range(detection_embedding.shape[1]):
            length += float(detection_embedding[j, c]) ** 2
        if length == 0.0:
            continue
        share = (1.0 - memory) / np.sqrt(length)
        for c in range(detection_embedding.shape[1]):
            track_embedding[i, c] = (
                memory * track_embedding[i, c] + share * detection_embedding[j, c]
            )
