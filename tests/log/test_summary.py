"""`inspect_log`: what it counts, and how it reads."""

from __future__ import annotations

import json

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.log import files
from tests.log.files import SHIPPED
from tracker.log import inspect_log, summary_text
from tracker.log.summary import near_duplicates


def summary_of(tmp_path, text, **options):
    return inspect_log(files.save(tmp_path, text), **options)


def test_what_is_counted(tmp_path):
    files.save(tmp_path, "image_width = 100\nimage_height = 50\nframes = 9\n", "sequence.toml")
    text = files.boxes(
        "1,10,10,20,20,0.05,cart\n1,10,10,20,20.5,0.95,cart\n"  # nearly the same box
        "2,90,10,20,20,1.0,boat\n"  # partly out of the image
        "6,200,10,20,20,0.5,\n7,-5,10,5,20,0.5,cart\n"  # wholly out, the second by touching
        "8,x,1,1,1,1,a\n8,y,1,1,1,1,a\n8,1,1,0,1,1,a\n8,1,1\n"
    )
    s = summary_of(tmp_path, text)
    assert (s.rows, s.rejected, s.frames) == (5, 4, 4)
    assert (s.first_frame, s.last_frame, s.missing_frames, s.gap_count) == (1, 7, 3, 1)
    gap = s.longest_gaps[0]
    assert (gap.after, gap.before, gap.missing) == (2, 6, 3)
    assert gap.seconds == pytest.approx(4 / 25)
    per_frame = s.detections_per_frame
    assert (per_frame.smallest, per_frame.quantiles[2], per_frame.largest) == (1, 1, 2)
    assert s.scores.counts == (1, 0, 0, 0, 0, 2, 0, 0, 0, 2)
    assert s.labels == {"boat": 1, "cart": 3}
    assert s.unlabelled == 1
    assert (s.outside.partly, s.outside.wholly) == (1, 2)
    assert (s.near_duplicates.pairs, s.near_duplicates.complete) == (1, True)
    assert s.ranges["width"].smallest == 5
    counts = [(one.count, one.column, one.reason, one.first_line) for one in s.rejections_by_reason]
    assert counts == [
        (2, "left", "not a number", 7),
        (1, "width", "must be greater than 0", 9),
        (1, "", "expected 7 fields, found 3", 10),
    ]
    assert [one.line for one in s.first_rejections] == [7, 8, 9, 10]
    assert s.rate_source == "assumed"


def test_gaps_in_times(tmp_path):
    s = summary_of(tmp_path, "time,x,y\n0.0,1,1\n0.1,1,1\n0.2,1,1\n0.7,1,1\n0.8,1,1\n")
    assert (s.missing_frames, s.gap_count) == (4, 1)
    assert (s.longest_gaps[0].after, s.longest_gaps[0].before) == (3, 4)
    assert s.outside is None
    assert s.near_duplicates is None
    assert s.scores is None
    assert set(s.ranges) == {"x", "y"}


def test_scores_beyond_one_have_their_own_range(tmp_path):
    s = summary_of(tmp_path, "frame,x,y,score\n1,1,1,-3\n2,1,1,7\n")
    assert (s.scores.edges[0], s.scores.edges[-1]) == (-3, 7)
    constant = summary_of(tmp_path, "frame,x,y,score\n1,1,1,9\n2,1,1,9\n")
    assert sum(constant.scores.counts) == 2


def test_summary_is_plain_json(tmp_path):
    values = json.loads(json.dumps(summary_of(tmp_path, files.delimited(files.BOXES)).as_dict()))
    assert values["detections_per_frame"]["largest"] == 2
    assert values["facts"]["name"] is None
    assert values["longest_gaps"][0]["missing"] == 1


def test_the_table_fits_eighty_columns_and_shows_no_control_characters(tmp_path):
    name = "a" * 100 + "\x1b[31m"
    text = files.boxes(f'1,10,10,20,20,0.5,{name}\n2,x,1,1,1,1,"\x1b[2J{"b" * 300}"\n')
    text += "".join(f"{k},1,1,2,2,0.{k % 10},kind {k}\n" for k in range(3, 60, 2))
    s = summary_of(tmp_path, text)
    for unicode in (True, False):
        table = summary_text(s, unicode=unicode)
        assert max(map(len, table.splitlines())) <= 80
        assert "\x1b" not in table
        assert "(18 more)" in table
    assert table.isascii()


def test_what_the_table_says(tmp_path):
    table = summary_text(summary_of(tmp_path, files.delimited(files.BOXES), frame_rate_hz=10))
    for part in (
        "csv, boxes",
        "4 used, 0 rejected",
        "3 with rows, 1 to 4",
        "0.100 s to 0.400 s",
        "10 Hz (settings)",
        "1 frame in 1 gap; 1 after frame 2 (0.2 s)",
        "1 at least, median 1, 2 at most",
    ):
        assert part in table
    assert "would be rejected" not in table
    assert "note" not in table


def test_a_truth_file_is_called_one():
    s = inspect_log(SHIPPED / "TUD-Campus" / "gt.txt", drop_identities=True)
    assert s.rows == 359
    assert "this is a truth or track file; the 8 identities" in summary_text(s)


def overlap(a, b):
    """IoU of two (left, top, width, height)."""
    across = min(a[0] + a[2], b[0] + b[2]) - max(a[0], b[0])
    down = min(a[1] + a[3], b[1] + b[3]) - max(a[1], b[1])
    common = max(across, 0.0) * max(down, 0.0)
    return common / (a[2] * a[3] + b[2] * b[3] - common)


place, size = st.sampled_from([0.0, 1.0, 1.5, 40.0, -3.0]), st.sampled_from([10.0, 10.5, 13.0])


@settings(max_examples=200)
@given(
    st.lists(st.lists(st.tuples(place, place, size, size), max_size=7), min_size=1, max_size=4),
    st.sampled_from([0.9, 0.5, 0.7]),
)
def test_near_duplicates_against_all_pairs(frames, iou):
    boxes = np.array([box for frame in frames for box in frame], float).reshape(-1, 4)
    offsets = np.cumsum([0, *map(len, frames)])
    expected = sum(
        overlap(a, b) > iou for frame in frames for k, a in enumerate(frame) for b in frame[:k]
    )
    assert near_duplicates(boxes, offsets, iou=iou).pairs == expected


def test_near_duplicates_stop_at_their_limit():
    boxes = np.tile([0.0, 0.0, 1.0, 1.0], (100, 1))
    found = near_duplicates(boxes, np.array([0, 100]), pair_limit=1000)
    assert not found.complete
    assert 0 < found.pairs <= 1000
    assert near_duplicates(boxes, np.array([0, 100])).pairs == 100 * 99 // 2
