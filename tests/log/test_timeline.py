"""Frame numbers, seconds, rates, and the facts beside a log."""

from __future__ import annotations

import numpy as np
import pytest

from tests.log import files
from tracker.errors import InputError, UsageError
from tracker.log import SequenceFacts, read_log, read_track_file, read_truth


def points(tmp_path, text, **options):
    return read_log(files.save(tmp_path, text), **options)


def found(log):
    return [(one.line, one.column, one.reason) for one in log.rejections]


def test_frame_numbers_alone_use_a_rate(tmp_path):
    text = "frame,x,y\n3,1,1\n5,1,1\n"
    log = points(tmp_path, text)
    assert (log.rate_hz, log.rate_source) == (25.0, "assumed")
    assert log.frame_times.tolist() == [3 / 25, 5 / 25]
    assert any("25 Hz is assumed" in note and "frame_rate_hz" in note for note in log.notes)
    log = points(tmp_path, text, frame_rate_hz=10)
    assert (log.rate_hz, log.rate_source) == (10.0, "settings")
    assert log.frame_times.tolist() == [0.3, 0.5]
    assert log.notes == ()
    files.save(tmp_path, "frame_rate_hz = 50\n", "sequence.toml")
    log = points(tmp_path, text, frame_rate_hz=10)
    assert (log.rate_hz, log.rate_source) == (50.0, "sequence.toml")
    for bad in (0, -1, float("nan"), float("inf")):
        with pytest.raises(UsageError, match="frame_rate_hz must be greater than 0"):
            points(tmp_path, text, frame_rate_hz=bad)


def test_times_alone_number_the_frames(tmp_path):
    log = points(tmp_path, "time,x,y\n0.5,1,1\n0.5,2,1\n0.6,1,1\n0.8,1,1\n0.9,1,1\n")
    assert log.frame_numbers.tolist() == [1, 2, 3, 4]
    assert log.frame_times.tolist() == [0.5, 0.6, 0.8, 0.9]
    assert log.offsets.tolist() == [0, 2, 3, 4, 5]
    assert log.rate_source == "timestamps"
    assert log.rate_hz == pytest.approx(10)
    assert log.notes == ()


def test_frames_and_times_together(tmp_path):
    # A missing frame number counts as a frame: the rate is frames per second, not rows.
    log = points(tmp_path, "frame,time,x,y\n10,1.0,1,1\n12,1.2,1,1\n14,1.4,1,1\n14,1.4,2,1\n")
    assert log.frame_numbers.tolist() == [10, 12, 14]
    assert log.frame_times.tolist() == [1.0, 1.2, 1.4]
    assert log.rate_hz == pytest.approx(10)


def test_a_single_time_says_no_rate(tmp_path):
    log = points(tmp_path, "time,x,y\n7.5,1,1\n7.5,2,1\n")
    assert (log.frame_times.tolist(), log.rate_source) == ([7.5], "assumed")


def test_rates_that_contradict_each_other_are_said(tmp_path):
    files.save(tmp_path, "frame_rate_hz = 30\n", "sequence.toml")
    log = points(tmp_path, "time,x,y\n0.0,1,1\n0.1,1,1\n0.2,1,1\n")
    assert log.rate_hz == 30
    assert "timestamps run at 10 Hz but sequence.toml says 30 Hz" in log.notes[0]
    log = points(tmp_path, "time,x,y\n0,1,1\n40000,1,1\n80000,1,1\n")
    assert any("is the time column in seconds?" in note for note in log.notes)


def test_unordered_frames_are_sorted_and_said(tmp_path):
    log = points(tmp_path, "frame,x,y\n2,1,1\n1,2,1\n2,3,1\n1,4,1\n3,5,1\n")
    assert log.z[:, 0].tolist() == [2, 4, 1, 3, 5]
    assert log.line.tolist() == [3, 5, 2, 4, 6]
    assert log.rejections == ()
    assert log.notes[0] == "2 rows were out of order and sorted by frame"


def test_time_running_backwards(tmp_path):
    log = points(tmp_path, "time,x,y\n1.0,1,1\n1.2,1,1\n1.1,1,1\n0.5,2,1\n1.2,3,1\n1.3,1,1\n")
    assert log.frame_times.tolist() == [1.0, 1.2, 1.3]
    assert found(log) == [
        (4, "time", "time runs backwards (line 3 has 1.2)"),
        (5, "time", "time runs backwards (line 3 has 1.2)"),
    ]
    # A row that is rejected for another reason is no measure for the rest.
    log = points(tmp_path, "time,x,y\n1.0,1,1\n9.0,x,1\n2.0,1,1\n")
    assert [one[:2] for one in found(log)] == [(3, "x")]


def test_frames_and_times_that_contradict_each_other(tmp_path):
    log = points(
        tmp_path,
        "frame,time,x,y\n"
        "1,0.1,1,1\n"
        "1,0.2,2,1\n"  # another time for frame 1
        "2,0.2,1,1\n"
        "3,0.2,2,2\n"  # the time of frame 2
        "3,0.2,3,2\n"
        "4,0.1,1,1\n"  # backwards
        "1,0.5,1,1\n"  # the frame number backwards
        "5,0.5,1,1\n",
    )
    assert log.frame_numbers.tolist() == [1, 2, 5]
    assert log.frame_times.tolist() == [0.1, 0.2, 0.5]
    assert found(log) == [
        (3, "time", "contradicts the time of frame 1 (line 2 has 0.1)"),
        (5, "time", "the time of another frame (line 4 has it for frame 2)"),
        (6, "time", "the time of another frame (line 4 has it for frame 2)"),
        (7, "time", "time runs backwards (line 4 has 0.2)"),
        (8, "frame", "frame number runs against time (line 4 has 2)"),
    ]


def test_frames_are_strictly_increasing_whatever_the_rows(tmp_path):
    random = np.random.default_rng(11)
    for _ in range(50):
        rows = np.column_stack([random.integers(0, 6, 12), random.integers(0, 6, 12) / 4])
        text = "".join(f"{f:.0f},{t},{k},0\n" for k, (f, t) in enumerate(rows))
        log = points(tmp_path, "frame,time,x,y\n" + text)
        assert np.all(np.diff(log.frame_numbers) > 0)
        assert np.all(np.diff(log.frame_times) > 0)
        assert len(log) + len(log.rejections) == 12


def test_truth_may_be_in_any_order(tmp_path):
    text = (
        "frame,time,x,y,object\n2,0.2,5,5,b\n1,0.1,1,1,b\n1,0.1,2,2,a\n3,0.2,1,1,a\n1,0.3,1,1,c\n"
    )
    truth = read_truth(files.save(tmp_path, text))
    assert truth.frame.tolist() == [1, 1, 2]
    assert truth.time.tolist() == [0.1, 0.1, 0.2]
    assert [truth.object_names[k] for k in truth.object] == ["a", "b", "b"]
    assert found(truth) == [
        (5, "time", "frame number runs against time (2 is at 0.2)"),
        (6, "time", "contradicts the time of frame 1 (line 3 has 0.1)"),
    ]


def test_truth_with_times_alone_numbers_them(tmp_path):
    text = "time,x,y,object\n0.4,1,1,a\n0.2,1,1,a\n0.2,2,1,b\n"
    truth = read_truth(files.save(tmp_path, text))
    assert truth.frame.tolist() == [1, 1, 2]
    assert truth.time.tolist() == [0.2, 0.2, 0.4]
    assert read_truth(files.save(tmp_path, "frame,x,y,id\n1,1,1,1\n")).time is None


def test_tracks_have_a_time_in_any_case(tmp_path):
    path = files.save(tmp_path, "frame,x,y,track\n50,1,1,1\n")
    assert read_track_file(path).time.tolist() == [2.0]
    files.save(tmp_path, "frame_rate_hz = 10.0\n", "sequence.toml")
    assert read_track_file(path).time.tolist() == [5.0]


def test_sequence_facts(tmp_path):
    path = files.save(tmp_path, files.delimited(files.POINTS), "quay/detections.csv")
    assert read_log(path).facts == SequenceFacts()
    assert read_log(path).name == "quay"
    files.save(
        tmp_path,
        'name = "Tern Quay"\nframe_rate_hz = 12.5\nframes = 600\nimage_width = 1920\n'
        'image_height = 1080.0\nsensor = "mast"\nweather = ["fog"]\n[zones]\na = 1\n',
        "quay/sequence.toml",
    )
    log = read_log(path)
    assert log.facts == SequenceFacts("Tern Quay", 12.5, 600, 1920.0, 1080.0, "mast")
    assert (log.name, log.rate_hz) == ("Tern Quay", 12.5)


def test_names_of_logs(tmp_path):
    for stem in ("detections", "truth", "tracks"):
        path = files.save(tmp_path, files.delimited(files.POINTS), f"harbour/{stem}.csv")
        assert read_log(path).name == "harbour"
    assert read_log(files.save(tmp_path, files.delimited(files.POINTS), "a/x.csv")).name == "x"


@pytest.mark.parametrize(
    ("line", "problem"),
    [
        ('frame_rate_hz = "30"', "'frame_rate_hz' must be a number greater than 0 (found '30')"),
        ("frame_rate_hz = 0", "'frame_rate_hz' must be a number greater than 0"),
        ("frame_rate_hz = nan", "'frame_rate_hz' must be a number greater than 0"),
        ("frames = 1.5", "'frames' must be a whole number greater than 0"),
        ("frames = true", "'frames' must be a whole number greater than 0"),
        ("image_width = -1", "'image_width' must be a number greater than 0"),
        ("name = 7", "'name' must be text in quotation marks"),
        ('sensor = " "', "'sensor' must be text in quotation marks"),
        ("name = ", "not valid TOML"),
        ("name = '\xff'", "not UTF-8 text (byte offset 8)"),
    ],
)
def test_facts_that_cannot_be(tmp_path, line, problem):
    path = files.save(tmp_path, files.delimited(files.POINTS))
    (tmp_path / "sequence.toml").write_bytes(line.encode("latin-1"))
    with pytest.raises(InputError) as caught:
        read_log(path)
    assert problem in str(caught.value)
    assert caught.value.path.name == "sequence.toml"
