"""Names of columns: found, mapped, suggested, ignored."""

from __future__ import annotations

import pytest

from tests.log import files
from tracker.errors import InputError, UsageError
from tracker.log import Kind, parse_columns, read_log, read_truth


def failure(tmp_path, header, **options):
    path = files.save(tmp_path, header + "\n" + ",".join("1" for _ in header.split(",")) + "\n")
    with pytest.raises((InputError, UsageError)) as caught:
        read_log(path, **options)
    return str(caught.value)


def test_mapping_names(tmp_path):
    path = files.save(tmp_path, "Frame,x1,y1,w,h,conf,score\n1,1,2,3,4,0.5,9\n")
    mapping = {"Frame": "frame", "x1": "left", "y1": "top", "w": "width", "h": "height"}
    log = read_log(path, columns=mapping | {"conf": "score"})
    assert log.z.tolist() == [[2.5, 4, 3, 4]]
    assert log.score.tolist() == [0.5]  # the mapped column goes before one of that very name
    assert log.notes[0] == "ignored columns: score"
    assert read_log(path, columns=mapping).score.tolist() == [9]


def test_mapping_names_in_other_formats(tmp_path):
    rows = {"t": [1, 2], "px": [1.0, 2.0], "label": [3.0, 4.0]}
    mapping = {"t": "frame", "px": "x", "label": "y"}
    for writer in (files.ndjson, files.parquet, files.delimited):
        log = read_log(files.save(tmp_path, writer(rows)), columns=mapping)
        assert log.z.tolist() == [[1, 3], [2, 4]]
        assert log.labels == ()


def test_mapping_errors(tmp_path):
    assert "there is no column 'widht'; did you mean 'width'?" in failure(
        tmp_path, "frame,x,y,w", columns={"w": "widht"}
    )
    message = failure(tmp_path, "frame,x,y,conf", columns={"cnof": "score"})
    assert "--columns names a column that is not there; did you mean 'conf'?" in message
    assert "found 'cnof'" in message
    assert "The columns are: frame, x, y, conf." in message
    assert "two columns are both mapped to 'score'" in failure(
        tmp_path, "frame,x,y,a,b", columns={"a": "score", "b": "score"}
    )
    path = files.save(tmp_path, files.benchmark(files.BOXES))
    with pytest.raises(UsageError, match="has no column names to map"):
        read_log(path, columns={"a": "frame"})


def test_parse_columns():
    assert parse_columns(["conf=score", "w=width, h = height", "a=b=x"]) == {
        "conf": "score",
        "w": "width",
        "h": "height",
        "a=b": "x",
    }
    for bad in ("score", "=score", "a=", ""):
        with pytest.raises(UsageError, match="expected THEIRS=OURS"):
            parse_columns([bad])


@pytest.mark.parametrize(
    ("header", "parts"),
    [
        ("a,b,c", ["no column for 'frame' or 'time' and the measurement", "found 'a, b, c'"]),
        ("frame,left,top,width", ["no column for 'height'", "Map other names with --columns"]),
        ("x,y", ["no column for 'frame' or 'time' (found"]),
        ("Frame,X,Y", ["--columns Frame=frame --columns X=x --columns Y=y?"]),
        ("timestamp,x,y", ["Did you mean --columns timestamp=time?"]),
        (
            "frame,x_min,y_min,w,h",
            ["--columns x_min=left --columns y_min=top --columns w=width --columns h=height?"],
        ),
        ("frame,left,top,widht,height", ["no column for 'width'", "--columns widht=width?"]),
        ("frame,pos_x,pos_y", ["--columns pos_x=x --columns pos_y=y?"]),
        ("frame|x|y", ["found 'frame|x|y'"]),
        (",".join("abcdefghijklmnop"), ["l, and 4 more'"]),
    ],
)
def test_unusable_headers_say_what_would_mend_them(tmp_path, header, parts):
    message = failure(tmp_path, header)
    assert "line 1: this is no header of a detections file" in message
    assert "Needed are 'frame' or 'time' (seconds), and 'left', 'top'" in message
    for part in parts:
        assert part in message


def test_the_suggestion_works(tmp_path):
    message = failure(tmp_path, "Frame,X,Y")
    flags = message.partition("Did you mean ")[2].rstrip("?").split("--columns ")[1:]
    path = files.save(tmp_path, "Frame,X,Y\n1,2,3\n")
    assert read_log(path, columns=parse_columns([f.strip() for f in flags])).z.tolist() == [[2, 3]]


def test_names_twice_and_gaps_in_groups(tmp_path):
    assert "two columns have the same name (found 'x')" in failure(tmp_path, "frame,x,y,x")
    assert len(read_log(files.save(tmp_path, "frame,x,y,o,o\n1,2,3,4,5\n"))) == 1
    message = failure(tmp_path, "frame,x,y,sigma_x")
    assert "there is 'sigma_x' but not 'sigma_y'" in message
    assert "Give all of sigma_x, sigma_y, or none." in message
    message = failure(tmp_path, "frame,x,y,embedding_0,embedding_2")
    assert "the embedding columns skip 'embedding_1'" in message


def test_boxes_go_before_points_and_the_rest_is_noted(tmp_path):
    text = ",frame,left,top,width,height,x,y,conf,colour,state\n0,1,1,2,3,4,5,6,0.5,red,new\n"
    log = read_log(files.save(tmp_path, text))
    assert log.kind is Kind.BOX
    assert "ignored columns: (no name), x, y, conf, colour, state" in log.notes
    assert "if column 'conf' is the score, say --columns conf=score" in log.notes


def test_header_names_are_trimmed_and_may_be_quoted(tmp_path):
    log = read_log(files.save(tmp_path, '"frame", x ,"y"\n1,2,3\n'))
    assert log.z.tolist() == [[2, 3]]


def test_line_of_the_header(tmp_path):
    with pytest.raises(InputError, match="line 4: this is no header"):
        read_log(files.save(tmp_path, "# a\n\n# b\nfoo,bar\n1,2\n"))


def test_more_than_one_sensor_is_said(tmp_path):
    text = "frame,x,y,sensor\n1,2,3,mast\n1,2,3,roof\n"
    log = read_log(files.save(tmp_path, text))
    assert len(log) == 2  # the same point seen by two sensors is no duplicate
    assert any("2 sensors (mast, roof)" in note for note in log.notes)
    one = read_log(files.save(tmp_path, text.replace("roof", "mast").replace("2,3,m", "4,3,m", 1)))
    assert not any("sensor" in note for note in one.notes)


def test_identities_in_a_log_are_refused_or_dropped(tmp_path):
    for column in ("id", "track", "object"):
        path = files.save(tmp_path, f"frame,x,y,{column}\n1,2,3,7\n1,4,3,A\n2,4,3,A\n")
        with pytest.raises(InputError) as caught:
            read_log(path)
        assert f"not a detection log: its column '{column}' holds 2 identities" in str(caught.value)
        assert "--drop-identities" in str(caught.value)
        log = read_log(path, drop_identities=True)
        assert len(log) == 3
        assert "this is a truth or track file" in log.notes[0]
    assert len(read_log(files.save(tmp_path, "frame,x,y,id\n1,2,3,-1\n1,4,3,-1\n"))) == 2
    assert len(read_log(files.save(tmp_path, "frame,x,y,id\n1,2,3,\n1,4,3,\n"))) == 2


def test_benchmark_identities_are_refused_or_dropped(tmp_path):
    path = files.save(tmp_path, files.benchmark(files.BOXES | {"id": [1, 2, 1, 1]}))
    with pytest.raises(InputError, match="its second column holds 2 identities"):
        read_log(path)
    assert len(read_log(path, drop_identities=True)) == 4
    assert len(read_log(files.save(tmp_path, files.benchmark(files.BOXES | {"id": [0] * 4})))) == 4


def test_truth_needs_identities(tmp_path):
    with pytest.raises(InputError) as caught:
        read_truth(files.save(tmp_path, files.delimited(files.POINTS)))
    assert "this truth file has no identities" in str(caught.value)
    assert "It needs a column 'object'" in str(caught.value)
    with pytest.raises(InputError, match="column 'id': this truth file has no identities"):
        read_truth(files.save(tmp_path, files.benchmark(files.BOXES)))
    with pytest.raises(InputError, match="no header of a truth file"):
        read_truth(files.save(tmp_path, "object,frame\na,1\n"))
