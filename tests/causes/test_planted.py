"""Scenes with one planted defect each: that cause must be behind at least 80% of the errors."""

from collections import Counter

import pytest

from tracker.causes import Cause, Error, diagnose
from tracker.offline import associate_log
from tracker.settings import load_settings
from tracker.simulation import SCENES, simulate
from tracker.simulation.overrides import scene_settings

# A calm scene: two dozen boxes far apart, all detected, no clutter.
CALM = (
    "drift.objects=24",
    "drift.spacing=300",
    "drift.life_seconds=600",
    "drift.clutter_per_object=0",
    "detection.probability=0.99999",
    "labels.error_probability=0",
    "clock.seconds=6",
)
# Noise as it was drawn; the objects turn sharply.
FITTING = (
    "measurement.position_sigma=0.035",
    "measurement.size_sigma=0.045",
    "motion.acceleration_noise=5.0",
)


def causes(tmp_path, scene, settings):
    """Errors by cause of one run on one scene."""
    sequence = simulate(
        "scale", seed=5, settings=scene_settings(SCENES["scale"].settings, overrides=scene)
    )
    associate_log(sequence.log(), load_settings(None, (*FITTING, *settings)), tmp_path / "run")
    return diagnose(tmp_path / "run", sequence.truth())


def dominates(diagnosis, cause, errors=tuple(Error), least=20):
    counts = Counter(item.cause for item in diagnosis.findings if item.error in errors)
    assert counts.total() >= least, counts
    share = counts[cause] / counts.total()
    assert share >= 0.8, counts


def test_a_calm_scene_has_hardly_any_errors(tmp_path):
    # Two boxes happen to meet; everybody else is left alone over 150 frames.
    assert len(causes(tmp_path, CALM, ()).findings) <= 5


# Planted: the scene's change, the settings' change, the cause that must dominate.
PLANTED = {
    "gate too tight": ((), ("gate.probability=0.6",), Cause.GATE),
    "noise too small": (
        (),
        ("measurement.position_sigma=0.004", "measurement.size_sigma=0.005"),
        Cause.GATE,
    ),
    "coasting too short": (
        ("detection.probability=0.8", "detection.miss_correlation_seconds=0.2"),
        ("lifecycle.coast_seconds=0.05",),
        Cause.ENDED,
    ),
    "missed detections": (("detection.probability=0.7",), (), Cause.NO_DETECTION),
    "birth score too high": ((), ("lifecycle.birth_score=0.99",), Cause.SCORE),
}


@pytest.mark.parametrize("name", PLANTED)
def test_the_planted_cause_dominates(tmp_path, name):
    scene, settings, cause = PLANTED[name]
    dominates(causes(tmp_path, (*CALM, *scene), settings), cause)


def test_confirmation_that_is_too_slow(tmp_path):
    diagnosis = causes(
        tmp_path,
        (*CALM, "detection.probability=0.8"),
        ("lifecycle.confirm_hits=15", "lifecycle.confirm_window=15"),
    )
    dominates(diagnosis, Cause.CONFIRMATION, (Error.LATE, Error.MISS))


def test_clutter_that_is_confirmed(tmp_path):
    diagnosis = causes(
        tmp_path, (*CALM, "drift.clutter_per_object=0.3"), ("lifecycle.confirm_hits=1",)
    )
    dominates(diagnosis, Cause.CLUTTER, (Error.FALSE,))


def test_crossing_objects_lose_contests(tmp_path):
    diagnosis = causes(
        tmp_path, (*CALM, "drift.spacing=45", "drift.objects=250"), ("gate.probability=0.99999999",)
    )
    dominates(diagnosis, Cause.CONTEST, (Error.SWITCH,), least=8)


def test_coasting_rows_that_are_reported_drift(tmp_path):
    diagnosis = causes(
        tmp_path,
        (*CALM, "detection.probability=0.6", "detection.miss_correlation_seconds=0.6"),
        ("output.report_coasting_seconds=5", "lifecycle.coast_seconds=5"),
    )
    dominates(diagnosis, Cause.COASTING, (Error.FALSE,), least=5)
