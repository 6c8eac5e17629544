"""IoU against plain loops and shapely."""

import numpy as np
import pytest

from tests.reference import overlap as twin
from tracker.kernels.overlap import box_overlap, generalised_overlap, overlap_matrix

shapely = pytest.importorskip("shapely")


def boxes(seed, count=40):
    rng = np.random.default_rng(seed)
    return np.column_stack((rng.uniform(0, 20, (count, 2)), rng.uniform(0.5, 9, (count, 2))))


def test_matrix_equals_the_twin():
    a, b = boxes(1), boxes(2, 30)
    np.testing.assert_allclose(overlap_matrix(a, b), twin.overlap_matrix(a, b), atol=1e-14)


def test_equals_shapely():
    def polygon(box):
        x, y, w, h = box
        return shapely.box(x - w / 2, y - h / 2, x + w / 2, y + h / 2)

    a, b = boxes(3), boxes(4)
    for k in range(len(a)):
        one, other = polygon(a[k]), polygon(b[k])
        expected = one.intersection(other).area / one.union(other).area
        assert box_overlap(a, k, b, k) == pytest.approx(expected, abs=1e-12)


def test_edges_and_degenerate_boxes():
    unit = np.array([0.0, 0.0, 1.0, 1.0])
    others = np.array(
        [unit, [1.0, 0.0, 1.0, 1.0], [0.0, 0.0, 0.0, 0.0], [0.0, 0.0, -3.0, 1.0]]
    )  # itself, one that only touches, one without size, one turned inside out
    overlap = overlap_matrix(unit[None], others)[0]
    np.testing.assert_allclose(overlap, [1.0, 0.0, 0.0, 0.0], atol=1e-8)
    assert overlap_matrix(np.empty((0, 4)), boxes(1)).shape == (0, 40)


def test_generalised_overlap_equals_the_twin_and_the_paper():
    a, b = boxes(5), boxes(6)
    np.testing.assert_allclose(
        generalised_overlap(a, b), twin.generalised_overlap(a, b), rtol=1e-12, atol=1e-14
    )
    # Two unit squares one apart: IoU 0, hull 3 x 1, union 2 (Rezatofighi et al. 2019, definition).
    apart = generalised_overlap(np.array([[0.0, 0, 1, 1]]), np.array([[2.0, 0, 1, 1]]))
    assert apart[0] == pytest.approx(-1 / 3)
    assert generalised_overlap(a, a).tolist() == pytest.approx([1.0] * len(a))
