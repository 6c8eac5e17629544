"""What holds for every scene: reproducible, readable, and one change changes one thing."""

from __future__ import annotations

import dataclasses
from functools import cache

import numpy as np
import pytest

from tests.simulation.pairs import pairs, settings
from tracker.errors import UsageError
from tracker.log import read_log, read_truth
from tracker.simulation import CLUTTER, SCENES, SimulatedSequence, simulate, write_sequence
from tracker.simulation.writing import sequence_files

SHORT = {
    "forecourt": ("clock.seconds=4",),
    "rush": ("clock.seconds=2",),
    "fog": ("clock.seconds=4",),
    "yard": ("clock.seconds=6",),
    "harbour": ("clock.seconds=60",),
    "sway": ("clock.seconds=4",),
    "outage": ("clock.seconds=8",),
    "scale": ("clock.seconds=1", "drift.objects=60"),
}
CLUTTER_RATE = {
    "yard": "lidar.clutter_per_frame=5",
    "harbour": "radar.clutter_per_scan=20",
    "scale": "drift.clutter_per_object=0.5",
}
scenes = pytest.mark.parametrize("scene", list(SHORT))


@cache
def short(scene: str, *changes: str, seed: int = 11) -> SimulatedSequence:
    return simulate(scene, seed=seed, settings=settings(scene, *SHORT[scene], *changes))


def detections_of_objects(sequence: SimulatedSequence) -> set[tuple]:
    """Frame, object, measurement, score and label of every detection that is not clutter."""
    found = sequence.detections
    rows = found.origin != CLUTTER
    columns = (found.frame, found.origin, *found.values.T, found.score, found.label)
    return set(zip(*(column[rows].tolist() for column in columns), strict=True))


def test_the_scenes_of_tern_quay():
    assert list(SCENES) == list(SHORT)


@scenes
def test_same_seed_same_bytes_other_seed_others(scene):
    first, other = short(scene), short(scene, seed=12)
    again = simulate(scene, seed=11, settings=settings(scene, *SHORT[scene]))
    assert sequence_files(first) == sequence_files(again)
    for name in ("detections.csv", "truth.csv"):
        assert sequence_files(first)[name] != sequence_files(other)[name]


@scenes
def test_memory_and_files_say_the_same(scene, tmp_path):
    """`log()` and `truth()` equal what the readers make of the files, bit by bit."""
    sequence = short(scene, "embedding.dimension=4")
    write_sequence(sequence, tmp_path / scene)
    log, truth = sequence.log(), sequence.truth()
    for ours, read in (
        (log, read_log(tmp_path / scene, strict=True)),
        (truth, read_truth(tmp_path / scene, strict=True)),
    ):
        for field in dataclasses.fields(ours):
            if field.name in ("path", "notes"):  # columns that the reader does not use are notes
                continue
            a, b = getattr(ours, field.name), getattr(read, field.name)
            if isinstance(b, np.ndarray):
                assert a.dtype == b.dtype, field.name
                assert np.array_equal(a, b, equal_nan=True), field.name
            else:
                assert a == b, field.name


@scenes
def test_more_clutter_changes_nothing_else(scene):
    calm = short(scene)
    wild = short(scene, CLUTTER_RATE.get(scene, "clutter.per_frame=30"))
    assert sum(wild.detections.origin == CLUTTER) > 1.5 * sum(calm.detections.origin == CLUTTER)
    assert detections_of_objects(calm) == detections_of_objects(wild)
    assert sequence_files(calm)["truth.csv"] == sequence_files(wild)["truth.csv"]


@scenes
def test_a_better_detector_only_adds_detections(scene):
    """Noise, scores and labels of what was detected before stay as they were."""
    poor = short(scene, "detection.probability=0.5")
    good = short(scene, "detection.probability=0.9")
    assert detections_of_objects(poor) < detections_of_objects(good)
    assert sequence_files(poor)["truth.csv"] == sequence_files(good)["truth.csv"]


@scenes
def test_a_longer_sequence_begins_as_the_shorter_one(scene):
    seconds = float(SHORT[scene][0].partition("=")[2])
    brief, longer = short(scene), short(scene, f"clock.seconds={1.5 * seconds}")
    frames = len(brief.frames)
    assert np.array_equal(brief.frames.time, longer.frames.time[:frames])
    for name in ("truth.csv", "detections.csv"):
        last = brief.frames.number[-1]
        table = longer.tables[name]
        rows = np.asarray(table["frame"]) <= last
        for column, values in brief.tables[name].items():
            if isinstance(values, tuple):
                values, others = values.code, table[column].code
            else:
                others = table[column]
            assert np.array_equal(values, others[rows]), (name, column)


@scenes
def test_truth_is_complete_and_sorted(scene):
    sequence = short(scene)
    true = sequence.objects
    assert np.all(np.diff(true.frame) >= 0)
    keys = true.frame * 10**6 + true.object
    assert np.all(np.diff(keys) > 0)  # by frame, then object; nobody twice in a frame
    first = np.array([true.frame[true.object == n].min() for n in range(1, true.object.max() + 1)])
    assert np.all(np.diff(first) >= 0)  # numbered by first appearance, without a gap
    assert true.visibility.min() >= 0.0
    assert true.visibility.max() <= 1.0
    assert np.all((true.probability >= 0.0) & (true.probability <= 1.0))
    # An object keeps its label.
    assert all(len(set(true.label[true.object == n].tolist())) == 1 for n in set(true.object))


@scenes
def test_the_order_of_rows_says_nothing_about_identity(scene):
    """By frame and falling score: the rank in the frame does not follow the object's number."""
    found = short(scene).detections
    assert np.all(np.diff(found.frame) >= 0)
    same = np.diff(found.frame) == 0
    assert np.all(np.diff(found.score)[same] <= 0)


def test_the_columns_of_each_file():
    boxes = ["left", "top", "width", "height"]
    for scene in ("forecourt", "scale"):
        tables = short(scene).tables
        assert list(tables["detections.csv"]) == ["frame", "time", *boxes, "score", "label"]
        assert list(tables["truth.csv"]) == [
            "frame", "time", "object", *boxes, "label", "visibility",
        ]  # fmt: skip
    assert list(short("outage").tables["detections.csv"])[:3] == ["frame", "time", "arrival"]
    yard = short("yard").tables
    assert list(yard) == [
        "detections.csv", "detections_oriented.csv", "truth.csv", "truth_oriented.csv",
    ]  # fmt: skip
    oriented = ["x", "y", "length", "width", "heading"]
    assert list(yard["detections_oriented.csv"]) == ["frame", "time", *oriented, "score", "label"]
    harbour = short("harbour").tables
    assert list(harbour["detections.csv"]) == [
        "frame", "time", "x", "y", "sigma_x", "sigma_y", "covariance_xy", "score", "label",
    ]  # fmt: skip
    assert list(harbour["detections_polar.csv"])[2:5] == ["range", "azimuth", "range_rate"]
    assert list(short("sway").tables["camera.csv"])[2:] == [
        "pan_degrees", "tilt_degrees", "roll_degrees", "zoom",
    ]  # fmt: skip


def test_the_files_of_a_sensor_agree_row_by_row():
    harbour = short("harbour").tables
    polar, plain = harbour["detections_polar.csv"], harbour["detections.csv"]
    for name in ("frame", "time", "score"):
        assert np.array_equal(polar[name], plain[name])
    # The conversion moves a point by less than r s² / 2 = 0.1 m; rounding is 0.01 m.
    assert plain["x"] == pytest.approx(polar["range"] * np.cos(polar["azimuth"]), abs=0.2)
    assert plain["y"] == pytest.approx(polar["range"] * np.sin(polar["azimuth"]), abs=0.2)
    yard = short("yard").tables
    assert np.array_equal(yard["detections.csv"]["x"], yard["detections_oriented.csv"]["x"])


def test_people_hide_each_other_and_are_then_missed():
    """In `rush` some are nearly hidden, and hardly any of those are detected."""
    sequence = simulate("rush", seed=2, settings=settings("rush", "clock.seconds=6"))
    true = sequence.objects
    hit = np.zeros(len(true), bool)
    hit[pairs(sequence)[1]] = True
    hidden, clear = true.visibility < 0.1, true.visibility > 0.9
    assert np.mean(hidden) > 0.02
    assert np.mean(hit[hidden]) < 0.25
    assert np.mean(hit[clear]) > 0.9


def test_sizes_of_people_follow_the_perspective():
    """Farther away is smaller: heights fall as 1 / depth, to the variation of people's heights."""
    sequence = short("forecourt")
    true = sequence.objects
    camera = sequence.settings.camera
    tilt = np.radians(camera.tilt_degrees)
    depth = true.xy[:, 1] * np.cos(tilt) + camera.mast_height_m * np.sin(tilt)
    people = true.label == sequence.labels.index("person")
    metres = true.values[people, 3] * depth[people] / camera.focal_px
    # 1.71 m seen from above at 22°: 1.71 cos 22° + up to 0.55 sin 22° of depth, and the top is
    # nearer than the foot.
    assert np.median(metres) == pytest.approx(1.75, abs=0.15)
    assert metres.std() < 0.2


def test_scale_grows_at_constant_density():
    small, large = short("scale"), short("scale", "drift.objects=600")
    ratio = (large.facts.image_width / small.facts.image_width) ** 2
    assert ratio == pytest.approx(10.0, rel=0.01)


def test_sway_is_forecourt_seen_from_a_moving_mast():
    still, moving = short("forecourt"), short("sway")
    assert np.ptp(moving.pose.pan) > 0.005
    assert np.ptp(still.pose.pan) == 0.0
    assert still.objects.xy[0] == pytest.approx(moving.objects.xy[0])


def test_wrong_calls_are_refused():
    with pytest.raises(UsageError, match=r"no scene 'harbor' .*did you mean 'harbour'"):
        simulate("harbor", seed=1)
    with pytest.raises(UsageError, match="takes settings of type YardSettings"):
        simulate("yard", seed=1, settings=settings("forecourt"))
    with pytest.raises(UsageError, match="nobody would be seen"):
        simulate(
            "forecourt",
            seed=1,
            settings=settings(
                "forecourt", "traffic.warm_up_seconds=0", "traffic.arrivals_per_minute=0.001",
                "clock.seconds=0.08", "clutter.per_frame=0",
            ),
        )  # fmt: skip
    with pytest.raises(UsageError, match=r"radar\.nearest_m must be less"):
        simulate("harbour", seed=1, settings=settings("harbour", "radar.nearest_m=5000"))
    with pytest.raises(UsageError, match="not one frame would be delivered"):
        short("forecourt", "delivery.drop_probability=1")


@pytest.mark.parametrize(
    ("scene", "change"),
    [
        ("scale", "drift.objects=10000000"),
        ("forecourt", "clock.frame_rate_hz=1e9"),
        ("fog", "clutter.per_frame=1e8"),
        ("harbour", "radar.clutter_per_scan=1e12"),
    ],
)
def test_slips_of_the_pen_are_refused_before_memory_runs_out(scene, change):
    with pytest.raises(UsageError, match="the limit is 5e"):
        short(scene, change)
