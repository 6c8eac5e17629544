"""Visible shares against shapely and hand values."""

from __future__ import annotations

import numpy as np
import pytest

from tracker.simulation.sensors.visibility import CELLS, visible_share


def test_hand_values():
    frame = np.zeros(3, np.int64)
    boxes = np.array([[0.0, 0.0, 10.0, 20.0], [5.0, 0.0, 10.0, 20.0], [0.0, 10.0, 20.0, 10.0]])
    # Box 0 is nearest; it hides the left half of box 1; both hide 3/4 of box 2.
    # A column of cells is 0.1 of a box: half of that is the largest error of one edge.
    share = visible_share(frame, boxes, np.array([1.0, 2.0, 3.0]))
    assert share == pytest.approx([1.0, 0.5, 0.25], abs=0.051)
    # Without depth differences nothing hides anything.
    assert visible_share(frame, boxes, np.ones(3)) == pytest.approx(np.ones(3))


def test_other_frames_do_not_hide():
    boxes = np.tile([0.0, 0.0, 10.0, 20.0], (2, 1))
    depth = np.array([2.0, 1.0])
    assert visible_share(np.array([0, 0]), boxes, depth).tolist() == [0.0, 1.0]
    assert visible_share(np.array([0, 1]), boxes, depth).tolist() == [1.0, 1.0]


def test_outside_the_view_is_not_visible():
    boxes = np.array([[-5.0, 0.0, 10.0, 10.0], [95.0, 95.0, 10.0, 10.0]])
    bounds = (0.0, 0.0, 100.0, 100.0)
    share = visible_share(np.zeros(2, np.int64), boxes, np.ones(2), bounds=bounds)
    assert share == pytest.approx([0.5, 0.25])


def test_nothing_in_view():
    assert len(visible_share(np.empty(0, np.int64), np.empty((0, 4)), np.empty(0))) == 0


@pytest.mark.parametrize("seed", range(10))
def test_agrees_with_the_area_of_a_union(seed):
    """Shapely as oracle. The cell grid may be wrong along the edges of what is hidden.

    Per edge of a covering box at most half a cell's column or row, in all at most
    edges x 0.5 / cells; ten covering boxes with few edges inside stay below 0.15.
    """
    shapely = pytest.importorskip("shapely")
    rng = np.random.default_rng(seed)
    low = rng.uniform(0, 40, (11, 2))
    boxes = np.concatenate((low, rng.uniform(5, 20, (11, 2))), axis=1)
    depth = rng.permutation(11).astype(float)
    share = visible_share(np.zeros(11, np.int64), boxes, depth)
    shapes = [shapely.box(x, y, x + w, y + h) for x, y, w, h in boxes]
    errors = []
    for i, shape in enumerate(shapes):
        nearer = shapely.union_all([s for j, s in enumerate(shapes) if depth[j] < depth[i]])
        errors.append(share[i] - shape.difference(nearer).area / shape.area)
    assert np.abs(errors).max() < 0.15
    assert abs(np.mean(errors)) < 1.5 / (CELLS[0] * np.sqrt(11))  # no bias
