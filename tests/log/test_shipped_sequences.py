"""Real files: the sequences in the data folder of the registry package motmetrics 1.4."""

from __future__ import annotations

import numpy as np
import pytest

from tests.log.files import SHIPPED
from tracker.errors import InputError
from tracker.log import box_corner, read_log, read_track_file, read_truth

SEQUENCES = ["TUD-Campus", "TUD-Stadtmitte"]


def reference(sequence, name):
    """(n, 2) frame and id, (n, 4) left, top, width, height, read by numpy, sorted by both."""
    table = np.loadtxt(SHIPPED / sequence / name, delimiter=",")
    table = table[np.lexsort((table[:, 1], table[:, 0]))]
    return table[:, :2], table[:, 2:6]


@pytest.mark.parametrize("sequence", SEQUENCES)
def test_truth_agrees_with_numpy_s_reader(sequence):
    truth = read_truth(SHIPPED / sequence / "gt.txt")
    index, boxes = reference(sequence, "gt.txt")
    identity = np.array([int(name) for name in truth.object_names])[truth.object]
    np.testing.assert_array_equal(np.column_stack([truth.frame, identity]), index)
    np.testing.assert_allclose(box_corner(truth.z), boxes, rtol=0, atol=1e-9)
    assert truth.scored.all()
    assert np.isnan(truth.visibility).all()
    assert truth.labels == ()
    assert truth.rejections == ()


@pytest.mark.parametrize("sequence", SEQUENCES)
def test_tracks_agree_with_numpy_s_reader(sequence):
    tracks = read_track_file(SHIPPED / sequence / "test.txt")
    index, boxes = reference(sequence, "test.txt")
    np.testing.assert_array_equal(np.column_stack([tracks.frame, tracks.track]), index)
    np.testing.assert_allclose(box_corner(tracks.z), boxes, rtol=0, atol=1e-9)
    assert tracks.reported.all()
    assert np.isnan(tracks.score).all()  # every confidence is -1


# Rows and identities counted with awk on the files.
@pytest.mark.parametrize(
    ("sequence", "truth_rows", "objects", "track_rows"),
    [("TUD-Campus", 359, 8, 222), ("TUD-Stadtmitte", 1156, 10, 749)],
)
def test_counts(sequence, truth_rows, objects, track_rows):
    truth = read_truth(SHIPPED / sequence / "gt.txt")
    assert (len(truth), len(truth.object_names)) == (truth_rows, objects)
    log = read_log(SHIPPED / sequence / "test.txt", drop_identities=True)
    assert len(log) == track_rows
    assert log.line.tolist() == list(range(1, track_rows + 1))


@pytest.mark.parametrize("sequence", SEQUENCES)
def test_results_are_no_detection_log(sequence):
    with pytest.raises(InputError, match="add --drop-identities"):
        read_log(SHIPPED / sequence / "test.txt")
