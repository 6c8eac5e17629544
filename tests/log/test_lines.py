"""Where rows stand: against Python's own csv module and plain loops."""

from __future__ import annotations

from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.log import files
from tracker.log import read_log
from tracker.log.delimited import find_header
from tracker.log.lines import find_rows

HERE = Path("log.csv")


def slow_rows(text: str) -> list[tuple[int, int, str]]:
    """(line, fields, text) of the rows of a text without quotes, line by line."""
    found = []
    for number, line in enumerate(text.split("\n"), start=1):
        line = line.removesuffix("\r")
        if line.strip(" \t\r") and not line.strip(" \t\r").startswith("#"):
            found.append((number, line.count(",") + 1, line))
    return found


def fast_rows(text: str) -> list[tuple[int, int, str]]:
    data = text.encode()
    rows = find_rows(data, ",", path=HERE)
    texts = rows.text(data, range(len(rows.line)))
    return list(zip(rows.line.tolist(), rows.fields.tolist(), texts, strict=True))


pieces = st.sampled_from(["a", "b1", ",", ",,", " ", "\t", "#", "\n", "\r\n", "\n\n", "é"])


@settings(max_examples=300)
@given(st.lists(pieces, min_size=1, max_size=20).map("".join))
def test_rows_without_quotes(text):
    assert fast_rows(text) == slow_rows(text)


cell = st.text(st.sampled_from('ab ,\n"#'), max_size=5)


@settings(max_examples=300)
@given(st.lists(st.lists(cell, min_size=2, max_size=4), min_size=1, max_size=6))
def test_rows_with_quotes(table):
    """Rows written by the csv module, each cell quoted, have the lines one would count."""
    text, expected, line = "", [], 1
    for k, cells in enumerate(table):
        row = ",".join('"' + cell.replace('"', '""') + '"' for cell in cells)
        if k % 2:
            text += "# comment\n\n"
            line += 2
        expected.append((line, len(cells), row))
        text += row + "\n"
        line += row.count("\n") + 1
    assert fast_rows(text) == expected


@pytest.mark.parametrize(
    "row", ['1,2,3,5" pipe', '1,2,3,"a"b', '1,2,3,a""b', "1,2,3,'a'", '1,2,3,"a,b"']
)
def test_stray_quotation_marks(tmp_path, row):
    """They are part of the value, and the rows below keep their lines."""
    text = f"frame,x,y,label\n{row}\n\n2,1,1,c\n2,x,1,c\n"
    log = read_log(files.save(tmp_path, text))
    assert log.line.tolist() == [2, 4]
    assert [one.line for one in log.rejections] == [5]


@pytest.mark.parametrize(
    ("text", "cells", "line", "delimiter"),
    [
        ("frame,x,y\n", ["frame", "x", "y"], 1, ","),
        ("\n# c\nframe\tx\ty\n", ["frame", "x", "y"], 3, "\t"),
        ('"a;b";c;d\n', ["a;b", "c", "d"], 1, ";"),
        ('"a,b";c;d\n', ["a,b", "c", "d"], 1, ";"),
        ("frame x  y", ["frame", "x", "y"], 1, " "),
        ("# frame,x,y\n1,2,3\n", ["frame", "x", "y"], 1, ","),
        ("# a note, with commas, in it\nframe,x,y\n1,2,3\n", ["frame", "x", "y"], 2, ","),
        ("# 1,2,3\n4,5,6\n", ["4", "5", "6"], 2, ","),
    ],
)
def test_headers(text, cells, line, delimiter):
    header = find_header(text.encode())
    assert (header.cells, header.line, header.delimiter) == (cells, line, delimiter)
    assert text.encode()[: header.stop].count(b"\n") in (line, line - 1)


def test_a_frame_of_fifty_thousand_boxes(tmp_path):
    rows = "".join(f"1,{k % 500},{k // 500},1,1,0.5,a\n" for k in range(50_000))
    log = read_log(files.save(tmp_path, files.boxes(rows)))
    assert log.frame_count == 1
    assert len(log.frame(0)) == 50_000
    assert log.line[-1] == 50_001
