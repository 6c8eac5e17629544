"""Detection, scores, labels and embeddings have the distributions that the settings state."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats
from scipy.special import logit

from tests.simulation.pairs import pairs, settings
from tracker.errors import SettingsError
from tracker.simulation import CLUTTER, simulate
from tracker.simulation.sensors.detector import (
    clutter_scores,
    confused,
    detection_probability,
    embeddings,
    object_scores,
)
from tracker.simulation.settings import (
    DetectionSettings,
    EmbeddingSettings,
    LabelSettings,
    ScoreSettings,
)
from tracker.simulation.streams import Streams

# Seeded, so nothing here can fail by chance later. Bounds are two-sided at 0.1% or 4 deviations:
# a wrong distribution fails them by far at these sample sizes.
TAIL = 0.001


def test_detection_probability_by_hand():
    chosen = DetectionSettings(
        probability=0.9, visibility_half=0.5, visibility_slope=0.1, size_half=20.0
    )
    found = detection_probability(
        np.array([1.0, 1.0, 0.5, 0.0]), np.array([1e6, 20.0, 1e6, 1e6]), chosen
    )
    # L(1) = 1 / (1 + exp(-5)) = 0.993307; L(0.5) = 0.5; L(0) = 0.006693.
    assert found == pytest.approx(
        [0.9, 0.45, 0.9 * 0.5 / 0.993307, 0.9 * 0.006693 / 0.993307], rel=1e-4
    )
    unlimited = DetectionSettings(probability=0.9, size_half=0.0)
    assert detection_probability(np.ones(1), np.zeros(1), unlimited)[0] == pytest.approx(0.9)


@pytest.mark.parametrize("scene", ["forecourt", "fog", "yard", "harbour", "scale"])
def test_detections_are_binomial(scene):
    """Sum over all objects against the sum of their probabilities, and by thirds of P_D."""
    changes = (
        ("drift.objects=200",) if scene == "scale" else ("detection.miss_correlation_seconds=0",)
    )
    sequence = simulate(scene, seed=3, settings=settings(scene, *changes))
    hit = np.zeros(len(sequence.objects), bool)
    hit[pairs(sequence)[1]] = True
    p = sequence.objects.probability
    for group in np.array_split(np.argsort(p, kind="stable"), 3):
        deviation = np.sqrt(np.sum(p[group] * (1.0 - p[group])))
        assert abs(hit[group].sum() - p[group].sum()) < 4 * deviation + 1e-9


def test_each_object_is_detected_at_most_once_a_frame():
    sequence = simulate("rush", seed=3, settings=settings("rush", "clock.seconds=4"))
    true = pairs(sequence)[1]
    assert len(np.unique(true)) == len(true)


def test_misses_come_in_runs_if_asked_and_as_often_as_before():
    """The share of misses right after a miss rises, the overall share does not."""

    def misses(correlation: float) -> tuple[float, float]:
        sequence = simulate(
            "scale",
            seed=1,
            settings=settings(
                "scale",
                "drift.objects=300",
                "drift.life_seconds=0",
                "detection.probability=0.8",
                f"detection.miss_correlation_seconds={correlation}",
            ),
        )
        hit = np.zeros(len(sequence.objects), bool)
        hit[pairs(sequence)[1]] = True
        missed = ~hit.reshape(-1, 300)
        return missed.mean(), (missed[1:] & missed[:-1]).sum() / missed[:-1].sum()

    alone, again = misses(0.0)
    # 30,000 independent looks: deviation sqrt(0.2 x 0.8 / 30,000) = 0.0023; 6,000 after a miss.
    assert alone == pytest.approx(0.2, abs=0.01)
    assert again == pytest.approx(0.2, abs=0.03)
    alone, again = misses(0.4)
    # 300 objects x 4 s / 0.4 s = about 1,500 independent looks (a Gauss-Markov process has about
    # duration / 2 tau of them): deviation 0.01.
    assert alone == pytest.approx(0.2, abs=0.04)
    # By the bivariate normal law with r = exp(-0.04 / 0.4) = 0.905, a miss after a miss has
    # probability Phi2(z, z; r) / 0.2 with z the 20% quantile.
    z, r = stats.norm.ppf(0.2), np.exp(-0.1)
    expected = stats.multivariate_normal([0, 0], [[1, r], [r, 1]]).cdf([z, z]) / 0.2
    assert again == pytest.approx(expected, abs=0.04)


def test_scores_are_logistic_normal():
    chosen = ScoreSettings(
        object_mean=1.0, object_sigma=0.5, visibility_gain=2.0, clutter_mean=-1.0, clutter_sigma=0.7
    )
    for visibility in (1.0, 0.25):
        logits = logit(object_scores(np.full(5000, visibility), chosen, Streams(2)))
        mean = 1.0 - 2.0 * (1.0 - visibility)
        assert stats.kstest(logits, "norm", args=(mean, 0.5)).pvalue > TAIL
    logits = logit(clutter_scores(5000, chosen, Streams(2)))
    assert stats.kstest(logits, "norm", args=(-1.0, 0.7)).pvalue > TAIL


def test_labels_are_confused_as_often_as_stated_and_evenly():
    label = np.repeat(np.arange(3, dtype=np.int32), 4000)
    found = confused(label, 3, LabelSettings(error_probability=0.12), Streams(1))
    wrong = found != label
    low, high = stats.binom.interval(1 - TAIL, 12_000, 0.12)
    assert low <= wrong.sum() <= high
    counts = [np.sum(wrong & (found == (label + k) % 3)) for k in (1, 2)]
    assert stats.chisquare(counts).pvalue > TAIL
    only = confused(np.zeros(50, np.int32), 1, LabelSettings(error_probability=1.0), Streams(1))
    assert not only.any()


@pytest.mark.parametrize(("dimension", "same"), [(16, 0.7), (64, 0.4), (32, 0.0), (8, 1.0)])
def test_embeddings_have_the_stated_separability(dimension, same):
    owner = np.repeat(np.arange(1, 2001), 2)
    chosen = EmbeddingSettings(dimension=dimension, same_cosine=same)
    vectors = embeddings(owner, 2001, 500, chosen, Streams(4)).astype(float)
    assert vectors.shape == (4500, dimension)
    assert np.linalg.norm(vectors, axis=1) == pytest.approx(np.ones(4500), abs=1e-6)
    pair = (vectors[0:4000:2] * vectors[1:4000:2]).sum(axis=1)
    spread = (1.0 - same) / np.sqrt(dimension - 1)
    assert abs(pair.mean() - same) <= 4 * spread / np.sqrt(2000) + 1e-6
    assert pair.std() == pytest.approx(spread, rel=0.08, abs=1e-6)  # 1 / sqrt(2 n) = 0.016, x 5
    other = (vectors[0:3998:2] * vectors[2:4000:2]).sum(axis=1)
    assert abs(other.mean()) < 4 / np.sqrt(dimension * 2000)
    assert other.std() == pytest.approx(1 / np.sqrt(dimension), rel=0.08)
    strange = (vectors[4000:] * vectors[:500]).sum(axis=1)
    assert abs(strange.mean()) < 4 / np.sqrt(dimension * 500)


def test_no_embedding_by_default_and_dimension_one_is_refused():
    assert (
        simulate("forecourt", seed=1, settings=settings("forecourt", "clock.seconds=1"))
        .log()
        .embedding
        is None
    )
    with pytest.raises(SettingsError, match=r"embedding.dimension: must be 0 or at least 2"):
        simulate("forecourt", seed=1, settings=settings("forecourt", "embedding.dimension=1"))


def test_scores_tell_objects_from_clutter():
    sequence = simulate("forecourt", seed=2)
    found = sequence.detections
    false = found.origin == CLUTTER
    assert np.median(found.score[~false]) > np.median(found.score[false]) + 0.2
