"""Identified rows: truth, our own tracks, other people's tracks."""

from __future__ import annotations

import math

import numpy as np
import pytest

from tests.log import files
from tracker.errors import InputError, RejectedRowsError
from tracker.log import Kind, read_log, read_track_file, read_truth
from tracker.results.tracks import TrackState

TRUTH_LAYOUT = """\
2,1,10,20,30,40,1,1,0.5
1,1,10,20,30,40,1,1,1
1,10,50,20,30,40,0,7,0
1,2,90,20,30,40,1,1,.25
"""


def test_truth_in_the_benchmark_layout(tmp_path):
    truth = read_truth(files.save(tmp_path, TRUTH_LAYOUT))
    assert truth.format == "benchmark"
    assert truth.frame.tolist() == [1, 1, 1, 2]
    assert truth.object_names == ("1", "2", "10")  # by size, not by spelling
    assert truth.object.tolist() == [0, 1, 2, 0]
    assert truth.scored.tolist() == [True, True, False, True]
    assert truth.visibility.tolist() == [1, 0.25, 0, 0.5]
    assert [truth.labels[k] for k in truth.label] == ["1", "1", "7", "1"]
    assert truth.line.tolist() == [2, 4, 3, 1]
    assert truth.z[0].tolist() == [25, 40, 30, 40]
    assert truth.time is None
    assert truth.notes == ()


def test_a_truth_layout_as_detections(tmp_path):
    log = read_log(files.save(tmp_path, TRUTH_LAYOUT), drop_identities=True)
    assert np.isnan(log.score).all()  # the flag is no confidence
    assert log.labels == ("1", "7")
    assert any("flag, class and visibility" in note for note in log.notes)


def test_nine_columns_of_results_are_no_truth_layout(tmp_path):
    truth = read_truth(files.save(tmp_path, "1,1,10,20,30,40,0.5,-1,-1\n1,2,9,9,9,9,0,-1,-1\n"))
    assert truth.scored.tolist() == [True, False]
    assert truth.labels == ()
    assert np.isnan(truth.visibility).all()


@pytest.mark.parametrize("writer", [files.delimited, files.ndjson, files.parquet])
@pytest.mark.parametrize("column", ["object", "track", "id"])
def test_truth_with_a_header(tmp_path, writer, column):
    rows = files.BOXES | {
        column: ["b", "a", "b", "c"],
        "visibility": [1.0, 0.5, None, 0.0],
        "scored": [1, 0, None, 1],
    }
    truth = read_truth(files.save(tmp_path, writer(rows)))
    assert truth.kind is Kind.BOX
    assert truth.object_names == ("a", "b", "c")
    assert truth.object.tolist() == [0, 1, 1, 2]
    assert truth.scored.tolist() == [False, True, True, True]
    assert [None if math.isnan(v) else v for v in truth.visibility] == [0.5, 1.0, None, 0.0]
    assert [truth.labels[k] for k in truth.label] == ["cart", "person", "person", "bicycle"]
    assert len(truth.digest) == 64


def test_flags_may_be_words(tmp_path):
    text = "frame,x,y,object,scored\n1,1,1,1,True\n2,1,1,1,false\n3,1,1,1,maybe\n4,1,1,1,0.0\n"
    truth = read_truth(files.save(tmp_path, text))
    assert truth.scored.tolist() == [True, False, False]
    assert [(one.line, one.column, one.reason) for one in truth.rejections] == [
        (4, "scored", "must be 1 or 0")
    ]


def test_identities_that_cannot_be(tmp_path):
    text = "frame,x,y,object\n1,1,1,7\n1,2,2,7.0\n1,3,3,\n1,4,4,-1\n1,5,5,8\n1,6,6,7\n2,1,1,7\n"
    path = files.save(tmp_path, text)
    truth = read_truth(path)
    assert truth.object_names == ("7", "8")
    assert [(one.line, one.column, one.reason) for one in truth.rejections] == [
        (3, "object", "'7' is in this frame already (line 2)"),
        (4, "object", "missing value"),
        (5, "object", "negative identity"),
        (7, "object", "'7' is in this frame already (line 2)"),
    ]
    with pytest.raises(RejectedRowsError, match="4 rows were rejected, the first: line 3"):
        read_truth(path, strict=True)


def test_zero_is_an_identity_of_truth(tmp_path):
    truth = read_truth(files.save(tmp_path, "frame,x,y,object\n1,1,1,0\n2,1,1,0\n"))
    assert truth.object_names == ("0",)


def test_our_own_tracks(tmp_path):
    text = (
        "frame,time,track,left,top,width,height,score,label,state,reported,line\n"
        "2,0.2,3,10,20,30,40,,person,coasting,0,\n"
        "1,0.1,3,10,20,30,40,0.5,person,tentative,1,2\n"
        "1,0.1,1,50,20,30,40,0.75,,confirmed,1,3\n"
    )
    tracks = read_track_file(files.save(tmp_path, text, "run/tracks.csv"))
    assert tracks.name == "run"
    assert tracks.track.tolist() == [1, 3, 3]
    assert tracks.state.tolist() == [
        TrackState.CONFIRMED,
        TrackState.TENTATIVE,
        TrackState.COASTING,
    ]
    assert tracks.reported.tolist() == [True, True, False]
    assert tracks.line.tolist() == [3, 2, -1]
    assert tracks.time.tolist() == [0.1, 0.1, 0.2]
    assert tracks.score.tolist()[:2] == [0.75, 0.5]
    assert math.isnan(tracks.score[2])
    assert tracks.label.tolist() == [-1, 0, 0]
    assert tracks.z[2].tolist() == [25, 40, 30, 40]


def test_tracks_of_others(tmp_path):
    path = files.save(
        tmp_path, files.benchmark(files.BOXES | {"id": [7, 9, 7, 7], "score": [-1] * 4})
    )
    tracks = read_track_file(path)
    assert tracks.track.tolist() == [7, 9, 7, 7]
    assert tracks.reported.all()
    assert (tracks.state == TrackState.CONFIRMED).all()
    assert np.isnan(tracks.score).all()
    assert (tracks.line == -1).all()
    named = files.POINTS | {"who": ["tern", "gull", "tern", "gull"]}
    tracks = read_track_file(files.save(tmp_path, files.ndjson(named)), columns={"who": "track"})
    assert tracks.track.tolist() == [0, 1, 1, 0]
    assert tracks.kind is Kind.POINT


def test_a_run_without_tracks_is_no_error(tmp_path):
    header = "frame,time,track,x,y,score,label,state,reported,line\n"
    tracks = read_track_file(files.save(tmp_path, header, "tracks.csv"))
    assert len(tracks) == 0
    assert tracks.kind is Kind.POINT
    assert tracks.z.shape == (0, 2)


@pytest.mark.parametrize(
    ("row", "problem"),
    [
        ("1,1,2,x,confirmed", "column 'y': a row of this track file cannot be used: not a number"),
        ("1,1,2,3,lost", "column 'state': a row of this track file cannot be used: must be tent"),
        ("1,1,2", "expected 5 fields, found 3"),
        ("1,7,2,3,confirmed", "'7' is in this frame already (line 2)"),
    ],
)
def test_track_files_are_read_whole_or_not_at_all(tmp_path, row, problem):
    text = f"frame,track,x,y,state\n1,7,2,3,confirmed\n{row}\n2,7,x,3,confirmed\n"
    with pytest.raises(InputError) as caught:
        read_track_file(files.save(tmp_path, text))
    assert caught.value.line == 3
    assert problem in str(caught.value)
    assert "; 1 more rows cannot be used either" in str(caught.value)


def test_labels_of_rejected_rows_leave_no_trace(tmp_path):
    text = files.boxes("1,1,1,0,1,1,aaa\n1,1,1,1,1,1,bbb\n1,1,1,2,1,1,ccc\n")
    log = read_log(files.save(tmp_path, text))
    assert log.labels == ("bbb", "ccc")
    assert log.label.tolist() == [0, 1]


def test_ids_beyond_what_a_float_holds_stay_apart(tmp_path):
    """Neighbours above 2**53 are one and the same float64 (IEEE 754: 53 significant bits)."""
    ids = (2**53, 2**53 + 1, 2**63 + 5)
    rows = "".join(f"{frame},{name},0,0,10,20\n" for frame in (1, 2) for name in ids)
    path = files.save(tmp_path, "frame,object,left,top,width,height\n" + rows, "truth.csv")
    truth = read_truth(path)
    assert truth.object_names == tuple(map(str, ids))
    assert truth.rejections == ()
    assert truth.object.tolist() == [0, 1, 2] * 2


@pytest.mark.parametrize("header", ["frame,object,x,y\n", "time,object,x,y,label,visibility\n"])
def test_a_truth_with_a_header_alone_says_that_there_was_nothing(tmp_path, header):
    truth = read_truth(files.save(tmp_path, header, "truth.csv"), strict=True)
    assert (len(truth), truth.object_names, truth.labels) == (0, (), ())
    assert truth.kind is Kind.POINT
    assert "nothing was there" in truth.notes[0]
    with pytest.raises(InputError, match="the file is empty"):
        read_truth(files.save(tmp_path, "", "nothing.csv"))
    with pytest.raises(InputError, match="has no identities"):
        read_truth(files.save(tmp_path, "frame,x,y\n", "detections.csv"))
    with pytest.raises(InputError, match="the only row was rejected"):
        read_truth(files.save(tmp_path, "frame,object,x,y\n1,a,0,far\n", "wrong.csv"))
