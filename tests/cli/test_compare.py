"""`margent compare`: what is read, printed and written, and exit codes."""

from __future__ import annotations

import csv
import json
import shlex
import shutil
from xml.etree import ElementTree

import pytest

from tests.log import files
from tests.log.files import SHIPPED
from tracker.cli.main import run

CAMPUS = SHIPPED / "TUD-Campus"
STADTMITTE = SHIPPED / "TUD-Stadtmitte"
NAMES = ("TUD-Campus", "TUD-Stadtmitte")
# 71 and 179 frames at 25 Hz are 2.84 and 7.16 seconds: three blocks and eight.
QUICK = ("--resamples", 200, "--block-seconds", 1)


def compared(capsys, *words):
    """Exit code, standard output and standard error."""
    code = run(["compare", *map(str, words)])
    captured = capsys.readouterr()
    return code, captured.out, captured.err


@pytest.fixture(scope="module")
def runs(tmp_path_factory):
    """Batches `old` (its gate too tight) and `new` over both sequences; `truth`."""
    folder = tmp_path_factory.mktemp("runs")
    logs = []
    for name in NAMES:
        for new, old in (("detections.txt", "test.txt"), ("truth.txt", "gt.txt")):
            target = folder / "truth" / name / new
            target.parent.mkdir(parents=True, exist_ok=True)
            target.write_bytes((SHIPPED / name / old).read_bytes())
        logs.append(str(folder / "truth" / name / "detections.txt"))
    words = ["associate", *logs, "--drop-identities", "--frame-rate-hz", "25"]
    tight = ["--set", "gate.probability=0.5"]
    assert run([*words, "--out", str(folder / "old"), *tight]) == 0
    assert run([*words, "--out", str(folder / "new")]) == 0
    return folder


def test_batches(capsys, runs):
    words = (runs / "old", runs / "new", "--truth", runs / "truth", *QUICK)
    code, out, err = compared(capsys, *words)
    assert code == 0
    parts = out.split("\n\n")
    assert parts[0] == f"A: {runs / 'old'}\nB: {runs / 'new'}"
    assert parts[1].splitlines()[0].split()[:3] == ["score", "A", "B"]
    assert "200 resamples of 11 blocks of 1 s, seed 0" in parts[1]
    assert [line.split()[0] for line in parts[2].splitlines()] == ["sequence", *NAMES]
    assert "gate.probability  0.5  0.999" in parts[3]
    assert "the runs part in frame" in parts[4]
    assert "margent explain" in parts[4]
    assert parts[5].startswith("objects: ")
    assert "personal data" in err
    assert "better" in out


def test_json_and_the_scores_of_evaluate(capsys, runs):
    words = (runs / "old", runs / "new", "--truth", runs / "truth", *QUICK)
    code, out, _ = compared(capsys, *words, "--json")
    assert code == 0
    found = json.loads(out)
    assert set(found) == {
        "a", "b", "overall", "sequences", "resampling", "objects", "partings", "notes", "settings",
    }  # fmt: skip
    assert list(found["sequences"]) == list(NAMES)
    for side, name in (("a", "old"), ("b", "new")):
        assert run(["evaluate", str(runs / name), "--truth", str(runs / "truth"), "--json"]) == 0
        alone = json.loads(capsys.readouterr().out)
        for score, change in found["overall"].items():
            assert change[side] == alone["overall"][score]
    assert found["settings"] == [
        {"setting": "gate.probability", "a": 0.5, "b": 0.999, "sequences": list(NAMES)}
    ]  # fmt: skip
    again = compared(capsys, *words, "--json", "--workers", 2)[1]
    assert again == out
    other = json.loads(compared(capsys, *words, "--json", "--seed", 1)[1])
    assert other["overall"] != found["overall"]
    assert other["partings"] == found["partings"]


def test_the_commands_it_names_show_the_decision(capsys, runs):
    words = (runs / "old", runs / "new", "--truth", runs / "truth", *QUICK)
    found = json.loads(compared(capsys, *words, "--json")[1])
    commands = [text for part in found["partings"].values() for text in part["commands"]]
    assert len(commands) >= 2
    for text in commands:
        program, *rest = shlex.split(text)
        assert program == "margent"
        assert run(rest) == 0
    assert "frame" in capsys.readouterr().out


def test_a_run_against_itself(capsys, runs):
    code, out, _ = compared(
        capsys, runs / "new", runs / "new", "--truth", runs / "truth", "--no-worse-than", "idf1=0",
        "--no-worse-than", "switches=0", "--by-interval", *QUICK,
    )  # fmt: skip
    assert code == 0
    assert "settings: the same in both runs" in out
    assert "TUD-Campus, TUD-Stadtmitte: both runs report the same rows and identities" in out
    assert "0 worse, 0 better" in out
    assert out.count("met  ") == 2
    assert "0 to 0" in out


def test_single_run_folders_and_plain_files(capsys, runs, tmp_path):
    truth = ("--truth", CAMPUS / "gt.txt", "--resamples", 200, "--block-seconds", 0.4)
    one = compared(capsys, runs / "old" / NAMES[0], runs / "new" / NAMES[0], *truth, "--json")
    assert one[0] == 0
    text = (runs / "new" / NAMES[0] / "tracks.csv").read_text("utf-8")
    seen = [line for line in text.splitlines() if ",coasting," not in line]
    plain = files.save(tmp_path, "\n".join(seen) + "\n", "mine.csv")
    mixed = compared(capsys, runs / "old" / NAMES[0], plain, *truth, "--json")
    assert mixed[0] == 0
    first, second = json.loads(one[1]), json.loads(mixed[1])
    assert list(second["sequences"]) == ["TUD-Campus"]
    assert second["settings"] == []
    for score in ("idf1", "switches"):
        assert first["overall"][score] == second["overall"][score]
    part = second["partings"]["TUD-Campus"]
    assert part["frame"] == first["partings"]["TUD-Campus"]["frame"]
    assert all("mine.csv" not in text for text in part["commands"])
    # A file in the benchmark layout, whose rows are told by place.
    code, out, _ = compared(capsys, CAMPUS / "test.txt", CAMPUS / "test.txt", *truth)
    assert code == 0
    assert "settings" not in out


def test_no_worse_than(capsys, runs, tmp_path):
    report = tmp_path / "out" / "report.xml"
    words = (runs / "new", runs / "old", "--truth", runs / "truth", *QUICK)
    limits = ("--no-worse-than", "switches=0", "--no-worse-than", "recall=50%")
    code, out, err = compared(capsys, *words, *limits, "--junit", report)
    assert code == 1
    assert "NOT MET  switches no worse by more than 0" in out
    assert "met      recall no worse by more than 0.5" in out
    assert "1 of 2 tolerances not met, the first: switches" in err
    root = ElementTree.parse(report).getroot()
    suite = root[0]
    assert (root.get("name"), suite.get("tests"), suite.get("failures")) == (
        "margent compare", "2", "1",
    )  # fmt: skip
    assert suite[0].get("name") == "switches no worse by more than 0"
    code, out, _ = compared(capsys, *words, *limits, "--json")
    assert code == 1
    found = json.loads(out)["no_worse_than"]
    assert [item["met"] for item in found] == [False, True]
    assert found[0]["worse_by"] > 0


def test_objects(capsys, runs, tmp_path):
    words = (runs / "old", runs / "new", "--truth", runs / "truth", *QUICK)
    file = tmp_path / "objects.csv"
    code, out, _ = compared(capsys, *words, "--show-objects", 2, "--objects", file)
    assert code == 0
    section = out.split("\n\n")[5].splitlines()
    assert len(section) == 5
    assert section[-1].startswith("and ")
    rows = list(csv.DictReader(file.read_text("utf-8").splitlines()))
    # The sequences have 8 and 10 objects (motmetrics' README).
    assert len(rows) == 18
    none = compared(capsys, *words, "--show-objects", 0)[1]
    assert len(none.split("\n\n")[5].splitlines()) == 1


def test_options_of_evaluate(capsys, tmp_path):
    truth = files.save(
        tmp_path,
        "frame,object,left,top,width,height,label\n1,a,0,0,10,20,person\n1,b,90,0,10,20,cart\n",
        "truth.csv",
    )
    header = "frame,track,left,top,width,height\n"
    a = files.save(tmp_path, f"{header}1,1,0,0,10,20\n1,2,90,0,10,20\n", "a.csv")
    b = files.save(tmp_path, f"{header}1,1,0,0,10,20\n", "b.csv")
    found = {}
    for words in ((), ("--ignore-class", "cart"), ("--score-class", "cart")):
        code, out, _ = compared(capsys, a, b, "--truth", truth, *words, "--json")
        assert code == 0
        found[words] = json.loads(out)["overall"]["misses"]["b"]
    assert list(found.values()) == [1, 0, 1]


@pytest.mark.parametrize(
    ("words", "sentence"),
    [
        (["{a}", "{a}"], "--truth"),
        (["{a}", "--truth", "{gt}"], "RUN_B"),
        (["{a}", "none.csv", "--truth", "{gt}"], "none.csv: there is no such file"),
        (["{old}", "{part}", "--truth", "{truth}"], "is in"),
        (["{old}", "{a}", "--truth", "{truth}"], "the runs have different sequences"),
        (["{a}", "{points}", "--truth", "{gt}"], "the tracks are points, the truth boxes"),
        (["{a}", "{a}", "--truth", "{gt}", "--resamples", "1"], "at least 100 resamples"),
        (["{a}", "{a}", "--truth", "{gt}", "--confidence", "95"], "the confidence is"),
        (["{a}", "{a}", "--truth", "{gt}", "--block-seconds", "-1"], "longer than 0 seconds"),
        (["{a}", "{a}", "--truth", "{gt}", "--seed", "-1"], "--seed"),
        (["{a}", "{a}", "--truth", "{gt}", "--no-worse-than", "idf=1"], "did you mean 'idf1'"),
        (["{a}", "{a}", "--truth", "{gt}", "--junit", "x.xml"], "give a tolerance"),
        (["{a}", "{a}", "--truth", "{gt}", "--by-interval"], "give a tolerance"),
        (["{a}", "{a}", "--truth", "{gt}", "--objects", "/dev/null/x.csv"], "cannot be written"),
        (["{a}", "{a}", "--truth", "{gt}", "--score-class", "x"], "no truth has the class 'x'"),
        (["{a}", "{a}", "--truth", "{gt}", "--coasting", "maybe"], "found 'maybe'"),
        (["{damaged}", "{new}", "--truth", "{truth}"], "not valid TOML"),
    ],
)
def test_wrong_use_is_a_sentence_and_exit_code_2(words, sentence, capsys, runs, tmp_path):
    part = tmp_path / "part"
    shutil.copytree(runs / "new" / NAMES[0], part / NAMES[0])
    shutil.copytree(runs / "new" / NAMES[1], part / "elsewhere")
    damaged = tmp_path / "damaged"
    shutil.copytree(runs / "new", damaged)
    (damaged / NAMES[0] / "settings.toml").write_text("= 3\n", "utf-8")
    facts = json.loads((part / "elsewhere" / "run.json").read_text("utf-8"))
    (part / "elsewhere" / "run.json").write_text(json.dumps(facts | {"name": "elsewhere"}), "utf-8")
    known = {
        "a": CAMPUS / "test.txt", "gt": CAMPUS / "gt.txt", "old": runs / "old",
        "new": runs / "new", "truth": runs / "truth", "part": part, "damaged": damaged,
        "points": files.save(tmp_path, "frame,track,x,y\n1,1,0,0\n", "points.csv"),
    }  # fmt: skip
    code, _, err = compared(capsys, *(word.format(**known) for word in words))
    assert code == 2
    assert sentence in err
    assert "Traceback" not in err
    assert "internal" not in err


def test_settings_of_another_version(capsys, runs, tmp_path):
    """What this version does not know is compared all the same."""
    later = tmp_path / "later"
    shutil.copytree(runs / "new" / NAMES[0], later)
    with (later / "settings.toml").open("a", encoding="utf-8") as file:
        file.write("\n[foresight]\nhorizon_seconds = 2.0\n[[zones]]\nname = 'quay'\n")
    words = (runs / "new" / NAMES[0], later, "--truth", CAMPUS / "gt.txt", *QUICK)
    code, out, _ = compared(capsys, *words)
    assert code == 0
    assert "foresight.horizon_seconds  -  2.0" in out
    assert "zones[0].name" in out


def test_what_the_runs_were_made_from(capsys, runs, tmp_path):
    other = tmp_path / "other"
    shutil.copytree(runs / "new" / NAMES[0], other)
    facts = json.loads((other / "run.json").read_text("utf-8"))
    facts["input"]["sha256"] = "0"
    facts["versions"]["margent"] = "9.9.9"
    (other / "run.json").write_text(json.dumps(facts), "utf-8")
    words = (runs / "new" / NAMES[0], other, "--truth", CAMPUS / "gt.txt", *QUICK)
    code, out, err = compared(capsys, *words, "--json")
    assert code == 0
    assert "the runs were made from different logs: TUD-Campus" in err
    assert "B by 9.9.9" in err
    assert len(json.loads(out)["notes"]) == 3  # and that there are too few blocks
    assert "different logs" not in compared(capsys, words[0], *words[:1], *words[2:])[2]


def test_rejected_truth_is_listed_once_and_strict_stops(capsys, tmp_path):
    truth = files.save(
        tmp_path, "frame,object,left,top,width,height\n1,a,0,0,10,20\n2,a,0,0,-1,20\n", "truth.csv"
    )
    tracks = files.save(
        tmp_path, "frame,track,left,top,width,height\n1,1,0,0,10,20\n", "tracks.csv"
    )
    words = (tracks, tracks, "--truth", truth)
    code, _, err = compared(capsys, *words)
    assert code == 0
    assert err.count("1 row of") == 1
    assert compared(capsys, *words, "--strict")[0] == 2
