"""`margent associate` end to end: logs in, runs out, and every kind of bad input."""

import csv
import os
import subprocess
import sys
from pathlib import Path

import motmetrics
import pyarrow.parquet as pq
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from tracker.cli.main import run

ROOT = Path(__file__).resolve().parent.parent.parent
SAMPLES = ROOT / "sample_sequences"
SHIPPED = Path(motmetrics.__file__).parent / "data"
HEADER = "frame,left,top,width,height,score\n"
GOOD = "1,10,20,30,40,0.9\n2,11,20,30,40,0.9\n3,12,20,30,40,0.9\n"


@pytest.fixture
def associate(tmp_path, capsys):
    """Run the command on a file with some content; returns (code, what it said, run folder)."""

    def command(content, *options, name="log.csv"):
        path = tmp_path / name
        if isinstance(content, bytes):
            path.write_bytes(content)
        elif content is not None:
            path.write_text(content, encoding="utf-8")
        code = run(["associate", str(path), "--out", str(tmp_path / "run"), *options])
        return code, capsys.readouterr().err, tmp_path / "run"

    return command


def test_a_sample_sequence(associate, tmp_path):
    code, told, out = associate(HEADER + GOOD)
    assert code == 0
    assert "3 frames, 3 detections, 1 tracks" in told
    assert "proved optimal" in told
    assert (out / "tracks.csv").is_file()


def test_a_missing_rate_is_assumed_and_said(associate):
    _, told, _ = associate(HEADER + GOOD)
    assert "note:" in told
    assert "25" in told


# Content, and what the message must say. All end with exit code 2 and leave no folder.
UNUSABLE = {
    "missing file": (None, ["there is no such file"]),
    "empty file": ("", ["empty"]),
    "header only": (HEADER, ["column names but no row"]),
    "wrong header": ("a,b,c\n1,2,3\n", ["frame", "--columns"]),
    "not text": (b"\x89PNG\r\n\x1a\n\x00\x00", ["binary file", "offset 8"]),
    "encoding": (HEADER.encode() + b"1,10,20,30,40,\xff\xfe\n", ["UTF-8", "line 2"]),
    "truth": ("frame,object,left,top,width,height\n1,7,1,2,3,4\n", ["--drop-identities"]),
    "all rejected": (HEADER + "1,x,20,30,40,0.9\n", ["line 2", "'left'", "not a number", "1,x,20"]),
}


@pytest.mark.parametrize("name", UNUSABLE)
def test_unusable_input_is_a_sentence_and_exit_code_2(associate, name):
    content, words = UNUSABLE[name]
    code, told, out = associate(content)
    assert code == 2
    assert "log.csv" in told
    assert "Traceback" not in told
    for word in words:
        assert word.lower() in told.lower(), told
    assert not out.exists()


# A bad row, its column, and a word of the reason.
REJECTED = {
    "text": ("4,abc,20,30,40,0.9", "left", "number"),
    "nan": ("4,nan,20,30,40,0.9", "left", "finite"),
    "infinite": ("4,inf,20,30,40,0.9", "left", "finite"),
    "negative size": ("4,10,20,-30,40,0.9", "width", "0"),
    "missing": ("4,,20,30,40,0.9", "left", "missing"),
    "duplicate": ("3,12,20,30,40,0.9", "", "line 4"),
    "too few": ("4,10,20", "", "fields"),
}


@pytest.mark.parametrize("name", REJECTED)
def test_bad_rows_are_listed_with_their_reason(associate, name):
    row, column, word = REJECTED[name]
    code, told, out = associate(HEADER + GOOD + row + "\n")
    assert code == 0
    assert "1 row rejected" in told
    (listed,) = csv.DictReader((out / "rejected.csv").open(encoding="utf-8"))
    assert (listed["line"], listed["column"]) == ("5", column)
    assert word in listed["reason"]
    assert listed["text"] == row


@pytest.mark.parametrize("name", REJECTED)
def test_strict_refuses_them(associate, name):
    code, told, out = associate(HEADER + GOOD + REJECTED[name][0] + "\n", "--strict")
    assert code == 2
    assert "1 row was rejected" in told
    assert not out.exists()


def test_time_that_runs_backwards_is_listed(associate):
    header = "time,x,y\n"
    code, _, out = associate(header + "0.0,1,1\n0.1,1,1\n0.05,1,1\n0.2,1,1\n")
    assert code == 0
    (listed,) = csv.DictReader((out / "rejected.csv").open(encoding="utf-8"))
    assert (listed["line"], listed["column"]) == ("4", "time")
    assert "backwards" in listed["reason"]


def test_a_heap_of_boxes_is_refused_with_a_remedy(associate):
    rows = "".join(
        f"{frame},{k % 40},{k // 40 % 40},50,50,0.9\n" for frame in (1, 2) for k in range(1600)
    )
    code, told, out = associate(HEADER + rows, "--set", "gate.candidate_limit=100000")
    assert code == 2
    assert "frame 2 has more than 100000 candidate pairs" in told
    assert not out.exists()


@settings(max_examples=40, deadline=None, suppress_health_check=list(HealthCheck))
@given(
    st.lists(
        st.sampled_from(
            [
                "1,10,20,30,40,0.9",
                "2,11,20,30,40,0.9",
                "2,x,20,30,40,0.9",
                "3,12,20,-1,40,0.9",
                "3,12,20,30,40",
                "4,nan,20,30,40,0.9",
                "# a comment",
                "",
                "5,13,20,30,40,0.5",
            ]
        ),
        min_size=1,
        max_size=12,
    )
)
def test_nothing_is_lost(tmp_path_factory, lines):
    """Every line is blank, a comment, a detection of the run, or a listed rejection."""
    folder = tmp_path_factory.mktemp("lines")
    path = folder / "log.csv"
    path.write_text(HEADER + "9,1,1,5,5,0.9\n" + "\n".join(lines) + "\n")
    assert run(["associate", str(path), "--out", str(folder / "run")]) == 0
    used = set(pq.read_table(folder / "run" / "detections.parquet")["line"].to_pylist())
    rows = csv.DictReader((folder / "run" / "rejected.csv").open(encoding="utf-8"))
    rejected = {int(row["line"]) for row in rows}
    data = {k for k, text in enumerate(lines, start=3) if text and not text.startswith("#")}
    assert used | rejected == data | {2}
    assert not used & rejected


def test_several_logs_and_any_number_of_workers_give_the_same_bytes(tmp_path):
    logs = [str(SAMPLES / name) for name in ("rush", "fog", "scale")]
    for workers in ("1", "2"):
        out = tmp_path / workers
        assert run(["associate", *logs, "--out", str(out), "--workers", workers]) == 0
    for path in sorted((tmp_path / "1").rglob("*")):
        if path.is_file() and path.name != "timings.json":
            twin = tmp_path / "2" / path.relative_to(tmp_path / "1")
            assert path.read_bytes() == twin.read_bytes(), path


def test_one_bad_log_does_not_stop_the_others(tmp_path, capsys):
    logs = [str(SAMPLES / "rush"), str(tmp_path / "none.csv"), str(SAMPLES / "fog")]
    assert run(["associate", *logs, "--out", str(tmp_path / "runs")]) == 2
    assert "1 of 3 logs failed" in capsys.readouterr().err
    assert {path.name for path in (tmp_path / "runs").iterdir()} == {"rush", "fog"}


def test_logs_of_one_sequence_get_folders_and_names_of_their_own(tmp_path):
    (tmp_path / "sequence.toml").write_text('name = "quay"\nframe_rate_hz = 10\n')
    for name in ("left", "right"):
        (tmp_path / f"{name}.csv").write_text(HEADER + GOOD)
    logs = [str(tmp_path / "left.csv"), str(tmp_path / "right.csv")]
    assert run(["associate", *logs, "--out", str(tmp_path / "runs")]) == 0
    assert {p.name for p in (tmp_path / "runs").iterdir()} == {"quay-left", "quay-right"}


@pytest.mark.parametrize("suffix", ["csv", "parquet", "ndjson", "txt"])
def test_every_format_gives_the_same_tracks(tmp_path, suffix):
    rows = [[f, 10.0 + 2 * f, 20.0, 30.0, 60.0, 0.5] for f in range(1, 15)]
    path = tmp_path / f"log.{suffix}"
    names = HEADER.strip().split(",")
    if suffix == "csv":
        path.write_text(HEADER + "".join(",".join(map(str, row)) + "\n" for row in rows))
    elif suffix == "parquet":
        import pyarrow as pa

        columns = {
            name: list(values) for name, values in zip(names, zip(*rows, strict=True), strict=True)
        }
        pq.write_table(pa.table(columns), path)
    elif suffix == "ndjson":
        import json

        path.write_text(
            "".join(json.dumps(dict(zip(names, row, strict=True))) + "\n" for row in rows)
        )
    else:
        path.write_text(
            "".join(f"{r[0]},-1,{r[1]},{r[2]},{r[3]},{r[4]},{r[5]},-1,-1,-1\n" for r in rows)
        )
    out = tmp_path / "run"
    assert run(["associate", str(path), "--out", str(out), "--frame-rate-hz", "10"]) == 0
    tracks = list(csv.DictReader((out / "tracks.csv").open(encoding="utf-8")))
    assert [row["track"] for row in tracks] == ["1"] * 14
    assert [float(row["left"]) for row in tracks] == [row[1] for row in rows]


def test_print_settings_is_a_file_that_settings_reads(tmp_path, capsys):
    assert run(["associate", "--print-settings", "--set", "gate.probability=0.95"]) == 0
    path = tmp_path / "s.toml"
    path.write_text(capsys.readouterr().out)
    assert run(["associate", "--print-settings", "--settings", str(path)]) == 0
    assert "probability = 0.95" in capsys.readouterr().out


def test_no_log_and_wrong_options_are_usage_errors(capsys):
    assert run(["associate"]) == 2
    assert run(["associate", "--gate", "3"]) == 2
    assert run(["associate", "--columns", "x", "log.csv"]) == 2
    assert run(["assoc"]) == 2
    assert "Traceback" not in capsys.readouterr().err


def test_the_shipped_sequences_without_identities(tmp_path, capsys):
    """Open data that motmetrics ships; their scores are tested with the evaluation."""
    for name in ("TUD-Campus", "TUD-Stadtmitte"):
        log = SHIPPED / name / "test.txt"
        out = tmp_path / name
        options = ["--drop-identities", "--frame-rate-hz", "25", "--out", str(out)]
        assert run(["associate", str(log), *options]) == 0
        assert "identities" in capsys.readouterr().err


def test_extensions_register_costs(tmp_path, capsys):
    extension = tmp_path / "mine.py"
    extension.write_text(
        "import numpy as np\nfrom tracker import register_cost\n"
        "register_cost('flat', lambda pairs: np.full(len(pairs), 0.25))\n"
    )
    words = ["associate", str(SAMPLES / "rush"), "--out", str(tmp_path / "run")]
    words += ["--set", "cost.terms=['overlap', 'flat']"]
    assert run([*words, "--extension", str(extension)]) == 0
    costs = pq.read_table(tmp_path / "run" / "decisions.parquet")["cost_flat"]
    assert set(costs.drop_null().to_pylist()) == {0.25}
    extension.write_text("1 / 0\n")
    assert run([*words, "--extension", str(extension)]) == 2
    assert "ZeroDivisionError" in capsys.readouterr().err


def test_the_command_itself(tmp_path):
    """As a user runs it: a process, exit codes, no traceback, output for a pipe."""
    margent = [sys.executable, "-m", "tracker"]
    environment = {**os.environ, "PYTHONPATH": str(ROOT)}

    def call(*words):
        return subprocess.run(
            [*margent, *words], capture_output=True, text=True, env=environment, cwd=tmp_path
        )

    help_text = call("--help")
    assert help_text.returncode == 0
    assert "associate" in help_text.stdout
    assert "personal data" in help_text.stdout
    done = call("associate", str(SAMPLES / "fog"), "--out", "fog")
    assert done.returncode == 0
    assert done.stdout == ""
    assert (tmp_path / "fog" / "run.json").is_file()
    failed = call("associate", "none.csv")
    assert failed.returncode == 2
    assert failed.stderr.startswith("margent: none.csv")
    assert "Traceback" not in failed.stderr


def test_an_internal_error_keeps_its_traceback_in_a_file(monkeypatch, capsys):
    import tracker.settings

    def broken(*words):
        raise RuntimeError("a bug")

    monkeypatch.setattr(tracker.settings, "load_settings", broken)
    assert run(["associate", "--print-settings"]) == 3
    told = capsys.readouterr().err
    assert "internal error: RuntimeError: a bug" in told
    path = Path(told.split("report it with ")[1].split(" ")[0])
    assert "Traceback" in path.read_text()
    path.unlink()
