"""Files that are not there, not readable or not logs."""

from __future__ import annotations

import gzip
import hashlib
import io
import os
import zipfile
from pathlib import Path

import pytest

from tests.log import files
from tracker.errors import InputError
from tracker.log import read_log, read_track_file, read_truth

READERS = [read_log, read_truth, read_track_file]


@pytest.mark.parametrize("read", READERS)
def test_missing_file(tmp_path, read):
    files.save(tmp_path, "x", "detections.csv")
    with pytest.raises(InputError) as caught:
        read(tmp_path / "detectoins.csv")
    assert "there is no such file" in str(caught.value)
    assert f"Did you mean {tmp_path / 'detections.csv'}?" in str(caught.value)
    assert caught.value.path == tmp_path / "detectoins.csv"
    with pytest.raises(InputError, match=r"folder .* is not there either"):
        read(tmp_path / "no" / "log.csv")


@pytest.mark.parametrize("read", READERS)
@pytest.mark.parametrize(
    ("content", "problem"),
    [
        (b"", "the file is empty"),
        (b"\n \n\n", "there is no header and no row"),
        (b"# only this\n", "there is no header and no row"),
        (b"\xef\xbb\xbf", "there is no header and no row"),
        (b"frame,x,y\n\x00\x01\x02", "this is a binary file"),
        (b"\x89PNG\r\n\x1a\n\0\0\0\rIHDR", "this is a binary file"),
        (gzip.compress(b"frame,x,y\n1,2,3\n", mtime=0), "compressed (gzip)"),
        (b'[{"frame": 1, "x": 1, "y": 2}]', "a JSON document, not one object a line"),
        (b'{\n  "frame": 1\n}\n', "a JSON document, not one object a line"),
        (b"1,2,3\n1,2,4\n", "the first row is not a header"),
        (b"a" * 200_000, "this is no header"),
        (b"1" * 200_000, "the first row is not a header"),
        (b"1.5,2.5,3,4,5,6\n2.5,2.5,3,4,5,6\n", "the first row is not a header"),
        (b'frame,x,y,id\n1,2,3,"a\n2,3,4,b\n', "a quotation mark in this row is never closed"),
        (b'frame,x,y,id\n1,2,3,"' + b"a\n" * 200_000, "a quotation mark in this row"),
        (b"PAR1 and nothing more", "not a readable Parquet file"),
    ],
)
def test_files_that_are_no_logs(tmp_path, read, content, problem):
    with pytest.raises(InputError) as caught:
        read(files.save(tmp_path, content))
    assert problem in str(caught.value)
    assert str(caught.value).startswith(str(tmp_path / "log.csv"))


def test_zip_archives_are_named_as_such(tmp_path):
    out = io.BytesIO()
    with zipfile.ZipFile(out, "w") as archive:
        archive.writestr("log.csv", "frame,x,y\n")
    with pytest.raises(InputError, match=r"zip archive or spreadsheet.*Export the table as CSV"):
        read_log(files.save(tmp_path, out.getvalue()))


@pytest.mark.parametrize("content", [files.boxes(""), "frame,x,y", "\n# c\nframe,x,y\n\n"])
def test_header_only(tmp_path, content):
    with pytest.raises(InputError, match="there are column names but no row"):
        read_log(files.save(tmp_path, content))
    with pytest.raises(InputError, match="there are column names but no row"):
        read_log(files.save(tmp_path, files.parquet({"frame": [], "x": [], "y": []})))


@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig", "utf-16"])
@pytest.mark.parametrize("ending", ["\n", "\r\n", "\r"])
def test_encodings_and_line_ends(tmp_path, encoding, ending):
    text = ending.join(["frame,x,y,label", "1,1,2,Fähre", "2,x,2,渡し船", "3,1,2,boat", ""])
    log = read_log(files.save(tmp_path, text.encode(encoding)))
    assert log.labels == ("Fähre", "boat")
    assert log.line.tolist() == [2, 4]
    assert [(one.line, one.text) for one in log.rejections] == [(3, "2,x,2,渡し船")]


def test_utf_16_of_both_byte_orders(tmp_path):
    for mark, encoding in ((b"\xff\xfe", "utf-16-le"), (b"\xfe\xff", "utf-16-be")):
        log = read_log(files.save(tmp_path, mark + "frame,x,y\n1,2,3\n".encode(encoding)))
        assert log.z.tolist() == [[2, 3]]


def test_unreadable_encoding_names_the_byte_and_the_line(tmp_path):
    text = "frame,x,y,label\n1,2,3,a\n2,3,4,F\xe4hre\n".encode("latin-1")
    with pytest.raises(InputError) as caught:
        read_log(files.save(tmp_path, text))
    assert caught.value.line == 3
    assert f"the byte 0xE4 at offset {text.index(0xE4)} cannot be read" in str(caught.value)
    assert "Save the file as UTF-8" in str(caught.value)
    with pytest.raises(InputError, match=r"line 2: not UTF-16 text: .* at offset"):
        read_log(files.save(tmp_path, "f\n1".encode("utf-16") + b"\x00\xd8\x20"))


@pytest.mark.skipif(os.geteuid() == 0, reason="the superuser may read everything")
def test_permission_denied_for_real(tmp_path):
    path = files.save(tmp_path, files.boxes(""))
    path.chmod(0)
    with pytest.raises(InputError, match="permission denied"):
        read_log(path)


def test_permission_denied(tmp_path, monkeypatch):
    def refuse(self):
        raise PermissionError(13, "Permission denied", str(self))

    path = files.save(tmp_path, files.boxes(""))
    monkeypatch.setattr(Path, "read_bytes", refuse)
    with pytest.raises(InputError, match=r"permission denied. You need the right to read"):
        read_log(path)


def test_device_errors_are_input_errors(tmp_path, monkeypatch):
    def fail(self):
        raise OSError(5, "Input/output error", str(self))

    path = files.save(tmp_path, files.boxes(""))
    monkeypatch.setattr(Path, "read_bytes", fail)
    with pytest.raises(InputError, match="cannot be read: Input/output error"):
        read_log(path)


def test_paths_that_cannot_be(tmp_path):
    for path in ("a\0b", tmp_path / ("x" * 5000)):
        with pytest.raises(InputError, match=r"cannot be read|no such file"):
            read_log(path)


def test_a_folder_stands_for_its_one_log(tmp_path):
    with pytest.raises(InputError, match=r"no file named 'detections\.\*' \(found 'nothing'\)"):
        read_log(tmp_path)
    files.save(tmp_path, files.delimited(files.POINTS), "detections.csv")
    files.save(tmp_path, files.delimited(files.POINTS | {"object": [1, 2, 1, 1]}), "truth.csv")
    assert len(read_log(tmp_path)) == 4
    assert len(read_truth(str(tmp_path))) == 4
    with pytest.raises(InputError, match=r"no file named 'tracks\.\*'"):
        read_track_file(tmp_path)
    files.save(tmp_path, "{}", "detections.ndjson")
    with pytest.raises(InputError) as caught:
        read_log(tmp_path)
    assert "more than one file named 'detections.*'" in str(caught.value)
    assert "detections.csv, detections.ndjson" in str(caught.value)
    assert "Name the file itself." in str(caught.value)


def test_a_run_folder_stands_for_its_tracks_csv(tmp_path):
    files.save(tmp_path, files.delimited(files.POINTS | {"track": [1, 2, 1, 1]}), "tracks.csv")
    files.save(tmp_path, b"PAR1", "tracks.parquet")
    assert len(read_track_file(tmp_path)) == 4


def test_digest_is_that_of_the_file(tmp_path):
    content = b"\xef\xbb\xbf" + files.delimited(files.POINTS).encode()
    log = read_log(files.save(tmp_path, content))
    assert log.digest == hashlib.sha256(content).hexdigest()
