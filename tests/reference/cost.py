"""Slow twins of kernels/cost.py, with scipy's densities."""

import math

import numpy as np
from scipy.stats import norm


def overlap_term(overlap, nats, neutral):
    """nats · (neutral − IoU)."""
    return [nats * (neutral - shared) for shared in overlap]


def mahalanobis_term(distance, threshold):
    """Half of d² minus the gate."""
    return [(d2 - threshold) / 2 for d2 in distance]


def likelihood_term(innovation, sigma, new_density):
    """−ln [N(innovation; 0, diag σ²) / λ_new] for independent components."""
    density = math.prod(norm.pdf(v, scale=s) for v, s in zip(innovation, sigma, strict=True))
    return -math.log(density / new_density)


def label_term(track_label, detection_label, agree_nats, differ_nats):
    """Agreement pays, difference costs, the unknown says nothing."""
    return [
        0.0 if -1 in (a, b) else (-agree_nats if a == b else differ_nats)
        for a, b in zip(track_label, detection_label, strict=True)
    ]


def appearance_term(track_embedding, row, detection_embedding, column, nats, neutral):
    """nats · (neutral − cosine)."""
    out = []
    for i, j in zip(row, column, strict=True):
        a, b = np.float64(track_embedding[i]), np.float64(detection_embedding[j])
        lengths = np.linalg.norm(a) * np.linalg.norm(b)
        out.append(nats * (neutral - a @ b / lengths) if lengths else 0.0)
    return out


def blend_embeddings(track_embedding, pairing, detection_embedding, memory):
    """The tracks' means after the frame."""
    out = np.array(track_embedding, dtype=np.float64)
    for i, j in enumerate(pairing):
        if j >= 0 and np.any(detection_embedding[j]):
            unit = detection_embedding[j] / np.linalg.norm(detection_embedding[j])
            out[i] = memory * out[i] + (1 - memory) * unit
    return out
