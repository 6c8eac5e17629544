"""Published scores: the sequences that motmetrics ships, and its README's example."""

from __future__ import annotations

import numpy as np
import pytest

from tests.evaluation.made import make_tracks, make_truth
from tests.log.files import SHIPPED
from tracker.evaluation import Scope, evaluate_all
from tracker.log import Kind, read_track_file, read_truth

SEQUENCES = ("TUD-Campus", "TUD-Stadtmitte")


@pytest.fixture(scope="module")
def shipped():
    files = {
        name: (
            read_track_file(SHIPPED / name / "test.txt"),
            read_truth(SHIPPED / name / "gt.txt"),
        )
        for name in SEQUENCES
    }
    return evaluate_all(files)


# The two sequences: the table in the README of motmetrics 1.4 (its package metadata), which says
# that the benchmark's own program gives the same. Overall: the sums of those rows.
TABLE = {
    "TUD-Campus": (55.8, 73.0, 45.1, 58.2, 94.1, 8, 1, 6, 1, 13, 150, 7, 7, 52.6, 0.277),
    "TUD-Stadtmitte": (64.5, 82.0, 53.1, 60.9, 94.0, 10, 5, 4, 1, 45, 452, 7, 6, 56.4, 0.346),
    "OVERALL": (62.4, 79.9, 51.2, 60.3, 94.0, 18, 6, 10, 2, 58, 602, 14, 13, 55.5, 0.330),
}


@pytest.mark.parametrize("name", list(TABLE))
def test_table_of_motmetrics_readme(shipped, name):
    scores = shipped.overall if name == "OVERALL" else shipped.sequences[name]
    c = scores.counts
    percent = [scores.idf1, scores.idp, scores.idr, scores.recall, scores.precision]
    found = [
        *(round(100 * value, 1) for value in percent),
        c.objects, c.mostly_tracked, c.partially_tracked, c.mostly_lost,
        c.false_positives, c.misses, c.switches, c.fragmentations,
        round(100 * scores.mota, 1), round(scores.motp, 3),
    ]  # fmt: skip
    assert tuple(found) == TABLE[name]


def meeting(a, b, ra, rb):
    """The point (with y ≥ 0) at distances ra and rb of two points on the x axis."""
    x = (ra**2 - rb**2 + (b - a) ** 2) / (2 * (b - a)) + a
    return x, np.sqrt(max(0.0, ra**2 - (x - a) ** 2))


# Distances in the README of objects 1, 2 and hypotheses, NaN for 'do not pair':
# [[.1, NaN, .3], [.5, .2, .3]], [[.2], [.4]], [[.6, .2], [.1, .6]]. Here the objects stand at
# x = 0 and 0.5 and hypotheses where those circles meet; NaN is 0.7, beyond the threshold.
FAR = 0.5
SCOPE = Scope(distance_threshold=0.65)


def three_frames(last):
    truth = [(f, k, x, 0.0) for f in (1, 2, 3) for k, x in ((1, 0.0), (2, FAR))]
    rows = [
        (1, 1, *meeting(0, FAR, 0.1, 0.5)),
        (1, 2, 0.7, 0.0),
        (1, 3, *meeting(0, FAR, 0.3, 0.3)),
        (2, 1, *meeting(0, FAR, 0.2, 0.4)),
        (3, 1, *meeting(0, FAR, 0.6, 0.1)),
        (3, 3, *meeting(0, FAR, 0.2, 0.6)),
    ]
    return (
        make_tracks([row for row in rows if row[0] <= last], Kind.POINT),
        make_truth([row for row in truth if row[0] <= last], Kind.POINT),
    )


# IDF1 (IDP, IDR, recall and precision are equal), objects, MT, PT, ML, FP, FN, switches, FM,
# MOTA, MOTP.
EXAMPLE = {
    "full": (83.3, 2, 1, 1, 0, 1, 1, 1, 1, 50.0, 0.340),
    "part": (75.0, 2, 1, 1, 0, 1, 1, 0, 0, 50.0, 0.167),
    "OVERALL": (80.0, 4, 2, 2, 0, 2, 2, 1, 1, 50.0, 0.275),
}


@pytest.mark.parametrize("name", list(EXAMPLE))
def test_three_frame_example_of_motmetrics_readme(name):
    found = evaluate_all({"full": three_frames(3), "part": three_frames(2)}, SCOPE)
    scores = found.overall if name == "OVERALL" else found.sequences[name]
    c = scores.counts
    for ratio in (scores.idf1, scores.idp, scores.idr, scores.recall, scores.precision):
        assert round(100 * ratio, 1) == EXAMPLE[name][0]
    assert EXAMPLE[name][1:] == (
        c.objects, c.mostly_tracked, c.partially_tracked, c.mostly_lost,
        c.false_positives, c.misses, c.switches, c.fragmentations,
        round(100 * scores.mota, 1), round(scores.motp, 3),
    )  # fmt: skip
