"""Rows that cannot be used: found, placed, explained, and nothing lost."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from tests.log import files
from tracker.errors import InputError, RejectedRowsError
from tracker.log import read_log
from tracker.log.sieve import find_repeats

GOOD = "1,10,20,30,40,0.5,cart\n"


def rejected(tmp_path, text, **options):
    """(line, column, reason, text) of each rejection."""
    log = read_log(files.save(tmp_path, text), **options)
    return [(one.line, one.column, one.reason, one.text) for one in log.rejections]


@pytest.mark.parametrize(
    ("row", "column", "reason"),
    [
        ("1,abc,20,30,40,0.5,cart", "left", "not a number"),
        ("1,1O,20,30,40,0.5,cart", "left", "not a number"),
        ("1,10,20,1_0,40,0.5,cart", "width", "not a number"),
        ("1,10,0x20,30,40,0.5,cart", "top", "not a number"),
        ("1,nan,20,30,40,0.5,cart", "left", "not a finite number"),
        ("1,10,20,30,inf,0.5,cart", "height", "not a finite number"),
        ("1,10,20,30,-Infinity,0.5,cart", "height", "not a finite number"),
        ("1,10,20,30,40,NaN,cart", "score", "not a finite number"),
        ("1,10,20,1e999,40,0.5,cart", "width", "not a finite number"),
        ("1,10,,30,40,0.5,cart", "top", "missing value"),
        ("1,10,  ,30,40,0.5,cart", "top", "missing value"),
        ('1,10,"",30,40,0.5,cart', "top", "missing value"),
        ("1,10,20,30,40,,cart", "score", "missing value"),
        (",10,20,30,40,0.5,cart", "frame", "missing value"),
        ("1,10,20,30,40,0.5", "", "expected 7 fields, found 6"),
        ("1,10,20,30,40,0.5,cart,x", "", "expected 7 fields, found 8"),
        ("1", "", "expected 7 fields, found 1"),
        ("1,10,20,0,40,0.5,cart", "width", "must be greater than 0"),
        ("1,10,20,30,-40,0.5,cart", "height", "must be greater than 0"),
        ("1.5,10,20,30,40,0.5,cart", "frame", "not a whole number"),
        ("inf,10,20,30,40,0.5,cart", "frame", "not a finite number"),
        ("1,1e13,20,30,40,0.5,cart", "left", "too large (the limit is 1e+12; time is in seconds)"),
        ("1,10,20,30,40,0.5,cart", "", "duplicate of line 2"),
        ('1,10,20,30,40,0.50,"cart"', "", "duplicate of line 2"),
    ],
)
def test_each_bad_row(tmp_path, row, column, reason):
    text = files.boxes(GOOD + row + "\n2,10,20,30,40,0.5,cart\n")
    assert rejected(tmp_path, text) == [(3, column, reason, row)]
    log = read_log(files.save(tmp_path, text))
    assert log.frame_numbers.tolist() == [1, 2]
    with pytest.raises(RejectedRowsError) as caught:
        read_log(files.save(tmp_path, text), strict=True)
    assert caught.value.count == 1
    assert f"1 row was rejected, the first: line 3{', column ' if column else ''}" in str(
        caught.value
    )
    assert reason in str(caught.value)


@pytest.mark.parametrize("writer", [files.ndjson, files.parquet])
def test_bad_cells_in_other_formats(tmp_path, writer):
    rows = files.POINTS | {"x": [1.0, float("nan"), None, 4.0], "y": [1.0, 1.0, 1.0, 1e300]}
    found = rejected(tmp_path, writer(rows))
    # Parquet cannot tell NaN from what a data frame writes for a missing value, and need not.
    assert [(line, column, reason) for line, column, reason, _ in found] == [
        (2, "x", "not a finite number"),
        (3, "x", "missing value"),
        (4, "y", "too large (the limit is 1e+12; time is in seconds)"),
    ]


@pytest.mark.parametrize(
    ("cell", "reason"),
    [
        ('"abc"', "not a number"),
        ('"1.5"', "not a number"),
        ("true", "not a number"),
        ("[1]", "not a number"),
        ("{}", "not a number"),
        ("null", "missing value"),
        ('""', "missing value"),
        ("NaN", "not a finite number"),
        ("-Infinity", "not a finite number"),
        ("1e999", "not a finite number"),
        ("9" * 400, "not a finite number"),
    ],
)
def test_bad_json_cells(tmp_path, cell, reason):
    row = f'{{"frame": 2, "x": {cell}, "y": 1}}'
    text = '{"frame": 1, "x": 1, "y": 1}\n\n# note\n' + row + '\n{"frame": 3, "x": 1, "y": 1}\n'
    assert rejected(tmp_path, text) == [(4, "x", reason, row)]


@pytest.mark.parametrize("row", ['{"frame": 2, "x": 1', "[1, 2]", "7", '"x"', "{'frame': 1}", "{"])
def test_lines_that_are_no_json_object(tmp_path, row):
    text = '{"frame": 1, "x": 1, "y": 1}\n' + row + '\n{"frame": 3, "x": 1, "y": 1}'
    assert rejected(tmp_path, text) == [(2, "", "not a JSON object", row)]


def test_missing_json_keys(tmp_path):
    text = '{"frame": 1, "x": 1, "y": 1}\n{"frame": 2, "x": 1}\n'
    assert rejected(tmp_path, text) == [(2, "y", "missing value", '{"frame": 2, "x": 1}')]


def test_bad_rows_of_the_benchmark_layout(tmp_path):
    text = (
        files.benchmark(files.BOXES)
        + "5,-1,1,2,3\n5,-1,x,2,3,4,1,-1,-1,-1\n\n5,-1,1,2,0,4,1,-1,-1,-1\n"
    )
    assert [one[:3] for one in rejected(tmp_path, text)] == [
        (5, "", "expected 10 fields, found 5"),
        (6, "left", "not a number"),
        (8, "width", "must be greater than 0"),
    ]


def test_text_of_blank_separated_rows_is_the_original(tmp_path):
    text = "frame  x y\n1   2  3\n  2  x   3 \n"
    assert rejected(tmp_path, text) == [(3, "x", "not a number", "  2  x   3 ")]


def test_negative_and_zero_sigma(tmp_path):
    text = "frame,x,y,sigma_x,sigma_y\n1,1,1,1,1\n2,1,1,-1,1\n3,1,1,1,0\n4,1,1,,1\n"
    assert [one[:3] for one in rejected(tmp_path, text)] == [
        (3, "sigma_x", "must be greater than 0"),
        (4, "sigma_y", "must be greater than 0"),
        (5, "sigma_x", "missing value"),
    ]


def test_a_column_without_any_value_is_ignored_with_a_note(tmp_path):
    text = "frame,x,y,score,sigma_x,sigma_y\n1,1,1,,,\n2,1,1,,,\n"
    log = read_log(files.save(tmp_path, text))
    assert len(log) == 2
    assert log.sigma is None
    assert "empty columns were ignored: score, sigma_x, sigma_y" in log.notes


def test_duplicates_name_the_first_and_only_full_repeats_count(tmp_path):
    text = files.boxes(
        GOOD + "1,10,20,30,40,0.6,cart\n1,10,20,30,40,0.5,boat\n2,10,20,30,40,0.5,cart\n" + GOOD * 2
    )
    found = rejected(tmp_path, text)
    assert [one[:3] for one in found] == [
        (6, "", "duplicate of line 2"),
        (7, "", "duplicate of line 2"),
    ]
    # Without scores and labels, and with zeros of both signs.
    text = "frame,x,y\n1,0,5\n1,-0.0,5\n1,0,6\n"
    assert [one[:3] for one in rejected(tmp_path, text)] == [(3, "", "duplicate of line 2")]


def test_rejections_of_all_kinds_are_sorted_by_line(tmp_path):
    text = files.boxes(GOOD + GOOD + "1\n1,x,20,30,40,0.5,cart\n2\n3,1,1,0,1,1,a\n" + GOOD)
    lines = [one[0] for one in rejected(tmp_path, text)]
    assert lines == [3, 4, 5, 6, 7, 8][: len(lines)]
    assert len(lines) == 6


def test_everything_rejected_is_an_input_error(tmp_path):
    path = files.save(tmp_path, files.boxes("1,x,2,3,4,5,a\n2,y,2,3,4,5,a\n3,1,2,3\n"))
    with pytest.raises(InputError) as caught:
        read_log(path)
    error = caught.value
    assert (error.line, error.column) == (2, "left")
    assert "all 3 rows were rejected, 2 of them for this reason: not a number" in str(error)
    assert "found '1,x,2,3,4,5,a'" in str(error)
    with pytest.raises(InputError, match="the only row was rejected: not a number"):
        read_log(files.save(tmp_path, files.boxes("1,x,2,3,4,5,a\n")))


def test_a_log_of_bad_rows_costs_no_more_than_their_mention(tmp_path):
    rows = [f"{k},{k if k % 7 else 'x'},20,30,40,0.5,cart" for k in range(1, 20_001)]
    log = read_log(files.save(tmp_path, files.boxes("\n".join(rows))))
    assert len(log.rejections) == 20_000 // 7
    assert all(one.line % 7 == 1 for one in log.rejections)  # line = frame + 1
    assert len(log) == 20_000 - 20_000 // 7


line = st.sampled_from(
    [
        "",
        " ",
        "# x",
        GOOD.strip(),
        "1,2",
        "3,1,1,1,1,1,b",
        "3,1,1,0,1,1,b",
        "x,1,1,1,1,1,b",
        "4,2,2,2,2,,",
    ]
)


@settings(
    max_examples=150, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture]
)
@given(
    lines=st.lists(line, max_size=12), ending=st.sampled_from(["\n", "\r\n"]), last=st.booleans()
)
def test_no_row_is_ever_lost(tmp_path, lines, ending, last):
    """Each line is blank, a comment, a detection with its number, or a listed rejection."""
    lines = [GOOD.strip(), *lines]
    text = files.boxes("").replace("\n", ending) + ending.join(lines) + (ending if last else "")
    log = read_log(files.save(tmp_path, text))
    expected = {k: text for k, text in enumerate(lines, start=2) if text.strip() and text[0] != "#"}
    lost = {one.line: one.text for one in log.rejections}
    assert sorted([*log.line.tolist(), *lost]) == sorted(expected)
    assert all(expected[number] == text for number, text in lost.items())


@settings(max_examples=200)
@given(
    st.lists(
        st.tuples(st.sampled_from([0.0, -0.0, 1.0, float("nan"), 1e300]), st.integers(-1, 2)),
        max_size=12,
    )
)
def test_repeats_against_a_plain_loop(rows):
    columns = [np.array([a for a, _ in rows], float), np.array([b for _, b in rows], np.int32)]
    expected, first = [], {}
    for k, (a, b) in enumerate(rows):
        key = ("nan" if a != a else a + 0.0, b)
        if key in first:
            expected.append((k, first[key]))
        first.setdefault(key, k)
    repeats, originals = find_repeats(columns)
    assert list(zip(repeats.tolist(), originals.tolist(), strict=True)) == expected
