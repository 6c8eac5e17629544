"""Every format gives the same log, and what was written comes back."""

from __future__ import annotations

import math
from pathlib import Path

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from tests.log import files
from tracker.errors import InputError, UsageError
from tracker.log import Kind, read_log

WRITERS = {
    "csv": files.delimited,
    "tsv": lambda rows: files.delimited(rows, "\t"),
    "semicolon": lambda rows: files.delimited(rows, ";"),
    "ndjson": files.ndjson,
    "parquet": files.parquet,
}


@pytest.mark.parametrize("writer", WRITERS)
def test_boxes_come_back(tmp_path, writer):
    log = read_log(files.save(tmp_path, WRITERS[writer](files.BOXES), "anything.dat"))
    assert log.format == (writer if writer in ("ndjson", "parquet") else "csv")
    assert log.kind is Kind.BOX
    assert log.frame_numbers.tolist() == [1, 2, 4]
    assert log.offsets.tolist() == [0, 2, 3, 4]
    # Filter order: centre x, centre y, width, height.
    np.testing.assert_array_equal(
        log.z, [[25, 40, 30, 40], [60.5, 85, 20, 50], [26, 41, 30, 40], [29, 43.5, 31.5, 41]]
    )
    assert log.score.tolist() == [0.9, 0.25, 0.875, 1.0]
    assert log.labels == ("bicycle", "cart", "person")
    assert log.label.tolist() == [2, 1, 2, 0]
    first = 1 if writer in ("ndjson", "parquet") else 2
    assert log.line.tolist() == [first, first + 1, first + 2, first + 3]
    assert log.rejections == ()
    assert (log.z.dtype, log.line.dtype, log.label.dtype) == (np.float64, np.int64, np.int32)


@pytest.mark.parametrize("writer", WRITERS)
def test_points_come_back(tmp_path, writer):
    log = read_log(files.save(tmp_path, WRITERS[writer](files.POINTS)))
    assert log.kind is Kind.POINT
    np.testing.assert_array_equal(log.z, np.column_stack([files.POINTS["x"], files.POINTS["y"]]))
    assert np.isnan(log.score).all()
    assert log.label.tolist() == [-1] * 4
    assert log.labels == ()
    assert log.sigma is None
    assert log.embedding is None


@pytest.mark.parametrize("delimiter", [",", ", ", ";", "\t", " ", "   "])
def test_benchmark_layout_comes_back(tmp_path, delimiter):
    log = read_log(files.save(tmp_path, files.benchmark(files.BOXES, delimiter)))
    assert log.format == "benchmark"
    assert log.z[0].tolist() == [25, 40, 30, 40]
    assert log.score.tolist() == files.BOXES["score"]
    assert log.line.tolist() == [1, 2, 3, 4]
    assert log.rejections == ()


@pytest.mark.parametrize("columns", [6, 7, 8, 10, 12])
def test_benchmark_layout_of_other_widths(tmp_path, columns):
    cells = ["1", "-1", "10", "20", "30", "40", "0.5", *["-1"] * 5][:columns]
    log = read_log(files.save(tmp_path, ",".join(cells) + "\n"))
    assert log.format == "benchmark"
    assert log.z.tolist() == [[25, 40, 30, 40]]
    assert math.isnan(log.score[0]) if columns == 6 else log.score[0] == 0.5


def test_benchmark_confidence_of_minus_one_is_no_score(tmp_path):
    log = read_log(files.save(tmp_path, files.benchmark(files.BOXES | {"score": [-1] * 4})))
    assert np.isnan(log.score).all()
    assert any("no scores" in note for note in log.notes)


def test_formats_can_be_forced(tmp_path):
    path = files.save(tmp_path, files.benchmark(files.BOXES))
    assert read_log(path, format="benchmark").format == "benchmark"
    with pytest.raises(InputError, match="no header of a detections file"):
        read_log(path, format="csv")
    with pytest.raises(InputError, match="not a Parquet file"):
        read_log(path, format="parquet")
    with pytest.raises(InputError, match="no JSON object"):
        read_log(path, format="ndjson")
    with pytest.raises(UsageError, match="csv, parquet, ndjson, benchmark"):
        read_log(path, format="xml")
    with pytest.raises(InputError, match="is a Parquet file"):
        read_log(files.save(tmp_path, files.parquet(files.BOXES)), format="csv")
    with pytest.raises(InputError, match="at least 6 numbers"):
        read_log(files.save(tmp_path, "1,2,3\n"), format="benchmark")


def test_comments_blank_lines_and_quotes_do_not_shift_lines(tmp_path):
    text = (
        "# made by hand\n\nframe,x,y,label\n"
        '1,1,2,a\n\n# between\n1,2,3,"two\nlines"\n   \n2,3,4,"say ""b"""\n'
    )
    log = read_log(files.save(tmp_path, text))
    assert log.line.tolist() == [4, 7, 10]
    assert log.labels == ("a", 'say "b"', "two\nlines")
    crlf = read_log(files.save(tmp_path, text.replace("\n", "\r\n")))
    assert crlf.line.tolist() == [4, 7, 10]
    assert read_log(files.save(tmp_path, "frame,x,y\r1,2,3\r2,3,4\r")).line.tolist() == [2, 3]


def test_a_comment_is_one_even_where_it_could_be_a_row(tmp_path):
    text = "label,frame,x,y\n#1,2,3,4\na,1,2,3\n  # b,1,3,3\nc#,1,4,5\n"
    for ending in ("", '"d",1,7,7\n'):
        log = read_log(files.save(tmp_path, text + ending))
        assert log.line.tolist()[:2] == [3, 5]
        assert log.labels[:2] == ("a", "c#")
        assert "2 comment lines (beginning with '#') left out" in log.notes


def test_a_commented_header_is_a_header(tmp_path):
    rows = "1 2 3 4 5 6\n2 2 3 4 5 6\n"
    text = "# frame left top width height score\n" + rows
    log = read_log(files.save(tmp_path, text))
    assert log.format == "csv"
    assert log.z.tolist() == [[4, 5.5, 4, 5], [4, 5.5, 4, 5]]
    assert log.line.tolist() == [2, 3]
    # A comment of another length is a comment, and the rows speak for themselves.
    plain = read_log(files.save(tmp_path, "# six numbers\n" + rows), drop_identities=True)
    assert plain.format == "benchmark"


def test_decimal_commas_between_semicolons(tmp_path):
    comma = read_log(files.save(tmp_path, "frame;x;y\n1;2,5;-3\n2;1e1;,5\n"))
    assert comma.z.tolist() == [[2.5, -3.0], [10.0, 0.5]]
    assert "numbers are written with a decimal comma" in comma.notes
    late = "".join(f"{k};{k},5;3\n" for k in range(1, 200)) + "200;1.5;1\n201;2,5;x\n"
    log = read_log(files.save(tmp_path, "frame;x;y\n" + late))
    assert log.z[-1].tolist() == [199.5, 3]  # a point may divide thousands: refused, not guessed
    assert [(one.line, one.column) for one in log.rejections] == [(201, "x"), (202, "y")]
    point = read_log(files.save(tmp_path, "frame;x;y\n1;2.5;3\n2;2,5;3\n"))
    assert point.z.tolist() == [[2.5, 3.0]]
    assert [one.line for one in point.rejections] == [3]


def test_numbers_may_be_written_in_many_ways(tmp_path):
    text = 'frame,x,y\n1.0, 1e2 ,+3\n2,".5",-0\n3,1.,1E-2\n'
    log = read_log(files.save(tmp_path, text))
    assert log.z.tolist() == [[100, 3], [0.5, 0], [1, 0.01]]
    careful = read_log(files.save(tmp_path, text + "4,x,1\n"))  # one bad cell: the careful way
    assert careful.z.tolist() == log.z.tolist()


def test_sigma_and_embedding_columns(tmp_path):
    rows = files.POINTS | {
        "sigma_y": [1, 2, 3, 4],
        "sigma_x": [0.5, 0.25, 1, 2],
        "embedding_1": [1, 0, 1, 0],
        "embedding_0": [0, 1, 0, 0.5],
    }
    for writer in WRITERS.values():
        log = read_log(files.save(tmp_path, writer(rows)))
        assert log.sigma.tolist() == [[0.5, 1], [0.25, 2], [1, 3], [2, 4]]
        assert log.embedding.tolist() == [[0, 1], [1, 0], [0, 1], [0.5, 0]]
        assert log.embedding.dtype == np.float32
        frame = log.frame(0)
        assert frame.sigma.tolist() == [[0.5, 1], [0.25, 2]]


def test_integer_labels_and_missing_labels(tmp_path):
    rows = files.POINTS | {"label": [10, 9, None, 10]}
    for writer in (files.ndjson, files.parquet, files.delimited):
        log = read_log(files.save(tmp_path, writer(rows)))
        assert log.labels == ("10", "9")  # text order
        assert log.label.tolist() == [0, 1, -1, 0]


def test_parquet_reads_other_types(tmp_path):
    import pyarrow as pa
    import pyarrow.parquet as pq

    table = pa.table(
        {
            "frame": pa.array([1, 2], pa.uint8()),
            "x": pa.array(["1.5", "2.5"]),
            "y": pa.array([1, 2], pa.float32()),
            "label": pa.array(["b", "a"]).dictionary_encode(),
            "score": pa.array([None, None], pa.null()),
        }
    )
    pq.write_table(table, tmp_path / "log")
    log = read_log(tmp_path / "log")
    assert log.z.tolist() == [[1.5, 1], [2.5, 2]]
    assert log.labels == ("a", "b")
    assert np.isnan(log.score).all()


def test_parquet_of_the_wrong_type_or_cut_short(tmp_path):
    import pyarrow as pa
    import pyarrow.parquet as pq

    pq.write_table(pa.table({"frame": [1], "x": [[1.0]], "y": [1]}), tmp_path / "log")
    with pytest.raises(InputError, match="column 'x': this column should hold numbers"):
        read_log(tmp_path / "log")
    path = files.save(tmp_path, files.parquet(files.BOXES)[:-20])
    with pytest.raises(InputError, match="not a readable Parquet file"):
        read_log(path)


def test_ndjson_keys_in_any_order_and_late(tmp_path):
    text = '{"y": 2, "x": 1, "frame": 1, "note": [1]}\n'
    text += "".join(f'{{"frame": {k}, "x": {k}, "y": 2}}\n' for k in range(2, 200))
    text += '{"frame": 200, "x": 1, "y": 2, "label": "late", "score": 1}\n'
    log = read_log(files.save(tmp_path, text))
    assert log.labels == ("late",)
    assert "ignored columns: note" in log.notes
    # A score in one row only: the other rows lack theirs.
    assert len(log) == 1
    assert {one.reason for one in log.rejections} == {"missing value"}


def test_many_chunks_of_ndjson_keep_their_lines(tmp_path):
    rows = [f'{{"frame": {k}, "x": {k}, "y": 0.123456789012345}}' for k in range(1, 60_001)]
    rows[30_000] = ""
    rows[45_000] = '{"frame": "x"}'
    log = read_log(files.save(tmp_path, "\n".join(rows)))
    assert len(log) == 59_998
    assert np.array_equal(log.line, log.frame_numbers)
    assert [(one.line, one.reason) for one in log.rejections] == [(45_001, "not a number")]


cells = st.floats(-1e9, 1e9, width=64)
texts = st.text(st.characters(exclude_categories=["Cs", "Cc", "Zs", "Zl", "Zp"]), max_size=6)


@st.composite
def logs(draw):
    n = draw(st.integers(1, 12))

    def column(cell):
        return draw(st.lists(cell, min_size=n, max_size=n))

    return {
        "frame": sorted(column(st.integers(-5, 20))),
        "left": column(cells),
        "top": column(cells),
        "width": column(st.floats(1e-3, 1e6)),
        "height": column(st.floats(1e-3, 1e6)),
        "score": [k / 16 for k in range(n)],  # distinct, so that no row repeats another
        "label": column(texts),
    }


@settings(
    max_examples=60, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture]
)
@given(rows=logs())
def test_any_log_round_trips_through_any_format(tmp_path: Path, rows):
    expected = np.column_stack([rows[name] for name in ("left", "top", "width", "height")])
    expected[:, :2] += 0.5 * expected[:, 2:]
    for writer in WRITERS.values():
        log = read_log(files.save(tmp_path, writer(rows)))
        np.testing.assert_array_equal(log.z, expected)
        assert np.repeat(log.frame_numbers, np.diff(log.offsets)).tolist() == rows["frame"]
        assert log.score.tolist() == rows["score"]
        found = [log.labels[code] if code >= 0 else "" for code in log.label]
        assert found == rows["label"]
        assert log.rejections == ()
