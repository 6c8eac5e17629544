"""Regions, visibility, every k-th frame, scores per class, several processes, self-check."""

from __future__ import annotations

import numpy as np
import pytest
from shapely.geometry import Polygon, box

from tests.evaluation.made import make_tracks, make_truth, random_scene, standing
from tests.log.files import SHIPPED
from tracker.errors import InputError, UsageError
from tracker.evaluation import (
    Scope,
    evaluate,
    evaluate_all,
    evaluate_classes,
    is_perfect,
    read_regions,
    self_check,
)
from tracker.log import Kind, read_truth
from tracker.simulation import SCENES, simulate


def totals(scores):
    c = scores.counts
    return c.matches, c.false_positives, c.misses


class TestRegions:
    # Objects at x = 0 and 100, and tracks on both and on nothing at 200.
    TRUTH = make_truth(standing([1], 1) + standing([1], 2, left=100.0))
    TRACKS = make_tracks(
        standing([1], 1) + standing([1], 2, left=100.0) + standing([1], 3, left=200.0)
    )

    def totals(self, *regions):
        return totals(evaluate(self.TRACKS, self.TRUTH, Scope(regions_ignored=regions)))

    def test_without(self):
        assert self.totals() == (2, 1, 0)

    def test_truth_in_a_region_and_what_lies_on_it(self):
        assert self.totals(box(95, -50, 120, 50)) == (1, 1, 0)

    def test_tracks_on_nothing_in_a_region(self):
        assert self.totals(box(195, -50, 220, 50)) == (2, 0, 0)

    def test_the_centre_decides(self):
        assert self.totals(box(106, -50, 220, 50)) == (
            2,
            0,
            0,
        )  # the box from 100 to 110 is half in
        assert self.totals(box(105, -50, 109, 50)) == (1, 1, 0)  # its centre is on the border

    def test_several_and_holes(self):
        assert self.totals(box(-10, -50, 20, 50), box(90, -50, 220, 50)) == (0, 0, 0)
        with_hole = Polygon(box(-50, -50, 300, 50).exterior, [box(95, -20, 115, 40).exterior])
        assert self.totals(with_hole) == (1, 0, 0)

    def test_a_track_that_leaves_a_region_for_scored_truth_stays(self):
        # Centre of the track in the region, but it is on an object whose centre is not.
        tracks = make_tracks(standing([1], 1, left=2.0))
        scores = evaluate(tracks, self.TRUTH, Scope(regions_ignored=(box(6, -50, 20, 50),)))
        assert totals(scores) == (1, 0, 1)

    def test_points(self):
        truth = make_truth([(1, 1, 0.0, 0.0), (1, 2, 50.0, 0.0)], Kind.POINT)
        tracks = make_tracks([(1, 1, 0.0, 1.0), (1, 2, 80.0, 0.0)], Kind.POINT)
        scope = Scope(distance_threshold=5.0, regions_ignored=(box(40, -10, 90, 10),))
        assert totals(evaluate(tracks, truth, scope)) == (1, 0, 0)


SQUARE = [[0, 0], [4, 0], [4, 2], [0, 2]]
GEOJSON = (
    '{"type": "FeatureCollection", "features": [{"type": "Feature", "properties": {}, "geometry": '
    '{"type": "Polygon", "coordinates": [[[0,0],[4,0],[4,2],[0,2],[0,0]]]}}]}'
)


@pytest.mark.parametrize(
    ("name", "text"),
    [
        ("a.toml", f"[[region]]\nname = 'pond'\npoints = {SQUARE}\n"),
        ("a.geojson", GEOJSON),
        ("a.json", '{"type": "Polygon", "coordinates": [[[0,0],[4,0],[4,2],[0,2],[0,0]]]}'),
        ("a.wkt", "# the pond\nPOLYGON ((0 0, 4 0, 4 2, 0 2, 0 0))\n\n"),
    ],
)
def test_region_files(name, text, tmp_path):
    path = tmp_path / name
    path.write_text(text, encoding="utf-8")
    regions = read_regions(path)
    assert len(regions) == 1
    assert regions[0].equals(Polygon(SQUARE))


@pytest.mark.parametrize(
    ("name", "text", "sentence"),
    [
        ("a.toml", "region", "cannot be read as TOML"),
        ("a.toml", "", "holds no region"),
        ("a.toml", "region = 3", "not a list of tables"),
        ("a.toml", "[[region]]\nname='x'", "region 1 cannot be read"),
        ("a.toml", "[[region]]\npoints=[[0,0],[1,1]]", "region 1 cannot be read"),
        ("a.toml", "[[region]]\npoints=[[0,0],[2,2],[2,0],[0,2]]", "no proper polygon: Self-inter"),
        ("a.json", "{", "cannot be read as JSON"),
        ("a.json", "3", "region 1 cannot be read"),
        ("a.json", '{"type": "Feature"}', "region 1"),
        ("a.json", '{"type": "Point", "coordinates": [0, 0]}', "region 1 is no polygon"),
        ("a.wkt", "\nPOLYGON ((0 0, 1", "line 2: is no well-known text"),
        ("a.wkt", "POINT (0 0)", "region 1 is no polygon"),
    ],
)
def test_bad_region_files(name, text, sentence, tmp_path):
    path = tmp_path / name
    path.write_text(text, encoding="utf-8")
    with pytest.raises(InputError, match=sentence):
        read_regions(path)


def test_hidden_truth_is_neither_found_nor_missed():
    truth = make_truth(standing([1, 2, 3], 7), visibility=np.array([0.1, 0.3, np.nan]))
    tracks = make_tracks(standing([1], 1))
    assert totals(evaluate(tracks, truth, Scope(visibility_floor=0.3))) == (0, 0, 2)


@pytest.mark.parametrize("floor", [-0.1, 1.1, float("nan")])
def test_visibility_floor_range(floor):
    with pytest.raises(UsageError, match="visibility is between 0 and 1"):
        evaluate(make_tracks([]), make_truth([]), Scope(visibility_floor=floor))


class TestFrameStride:
    TRUTH = make_truth(standing([2, 4, 6, 8, 10], 7))
    TRACKS = make_tracks(standing(range(1, 12), 1))

    @pytest.mark.parametrize(
        ("stride", "found"), [(None, (5, 6, 0)), (1, (5, 0, 0)), (2, (3, 0, 0)), (9, (1, 0, 0))]
    )
    def test_every_kth_annotated_frame(self, stride, found):
        scores = evaluate(self.TRACKS, self.TRUTH, Scope(frame_stride=stride))
        assert totals(scores) == found
        assert scores.counts.frames == sum(found[:2])

    def test_range(self):
        with pytest.raises(UsageError, match="stride is at least 1"):
            evaluate(self.TRACKS, self.TRUTH, Scope(frame_stride=0))


class TestClasses:
    TRUTH = make_truth(
        standing([1, 2], 1) + standing([1, 2], 2, left=100.0),
        words=["person", "person", "cart", "cart"],
    )

    def tracks(self, words):
        labels = tuple(sorted({word for word in words if word}))
        codes = np.array([labels.index(word) if word else -1 for word in words], np.int32)
        rows = standing([1, 2], 1) + standing([1, 2], 2, left=100.0)
        return make_tracks(rows, label=codes, labels=labels)

    def found(self, words):
        scores = evaluate_classes(self.tracks(words), self.TRUTH)
        return {label: totals(value) for label, value in scores.items()}

    def test_tracks_without_labels(self):
        assert self.found([None] * 4) == {"cart": (2, 0, 0), "person": (2, 0, 0)}

    def test_a_wrong_label_is_a_miss_of_the_right_class_and_wrong_in_its_own(self):
        # The second person row is called a cart: for carts it lies on ignored truth.
        words = ["person", "cart", "cart", "cart"]
        assert self.found(words) == {"cart": (2, 0, 0), "person": (1, 0, 1)}

    def test_labels_that_the_truth_does_not_have_stay(self):
        assert self.found(["wagon"] * 4) == {"cart": (2, 0, 0), "person": (2, 0, 0)}

    def test_summed_over_sequences(self):
        other = make_truth(standing([1], 1), words=["person"])
        found = evaluate_all(
            {"a": (self.tracks([None] * 4), self.TRUTH), "b": (make_tracks([]), other)},
            per_class=True,
        )
        assert {label: totals(value) for label, value in found.classes.items()} == {
            "cart": (2, 0, 0), "person": (2, 0, 1),
        }  # fmt: skip
        assert list(found.as_dict()["classes"]) == ["cart", "person"]

    @pytest.mark.parametrize("name", ["classes_scored", "classes_ignored"])
    def test_a_class_that_nobody_has(self, name):
        pair = (self.tracks([None] * 4), self.TRUTH)
        with pytest.raises(UsageError, match=r"class 'persn'.*did you mean 'person'"):
            evaluate_all({"a": pair}, Scope(**{name: ("persn",)}))


def test_workers_change_nothing():
    sequences = {f"s{seed}": random_scene(seed) for seed in range(3)}
    alone = evaluate_all(sequences).as_dict()
    assert evaluate_all(sequences, workers=2).as_dict() == alone


def test_a_scope_for_each_sequence():
    pair = make_tracks(standing([1], 1)), make_truth(standing([1], 7))
    scopes = {"a": Scope(), "b": Scope(regions_ignored=(box(-50, -50, 50, 50),))}
    found = evaluate_all({"a": pair, "b": pair}, scopes)
    assert totals(found.overall) == (1, 0, 0)


class TestSelfCheck:
    @pytest.mark.parametrize("name", ["TUD-Campus", "TUD-Stadtmitte"])
    def test_shipped_truth(self, name):
        scores = self_check(read_truth(SHIPPED / name / "gt.txt"))
        assert is_perfect(scores)
        assert (scores.mota, scores.idf1, scores.hota) == (1.0, 1.0, 1.0)

    @pytest.mark.parametrize("scene", [name for name in SCENES if name != "scale"])
    def test_simulated_truth_with_all_options(self, scene):
        truth = simulate(scene, seed=5).truth()
        scope = Scope(
            distance_threshold=1.0,
            classes_scored=truth.labels[:1],
            classes_ignored=truth.labels[1:2],
            visibility_floor=0.5,
            frame_stride=3,
            regions_ignored=(box(0, 0, 300, 300),),
        )
        assert is_perfect(self_check(truth, scope))

    def test_objects_that_lie_exactly_on_each_other(self):
        rows = standing([1, 2], 1) + standing([1, 2], 2)
        assert is_perfect(self_check(make_truth(rows)))

    def test_less_than_perfect(self):
        half = make_tracks(standing([1], 1) + standing([2], 2))
        assert not is_perfect(evaluate(half, make_truth(standing([1, 2], 7))))
