"""The repository's own rules catch what they are for, and its documents keep up with the code.

That the rules hold is what scripts/check.py looks at.
"""

from __future__ import annotations

import ast
import os
import re
import tomllib
from collections.abc import Iterator
from importlib.metadata import distributions, requires
from pathlib import Path

import pytest
from packaging.requirements import Requirement
from packaging.utils import canonicalize_name

import tracker
from scripts import rules

ROOT = Path(__file__).resolve().parent.parent
PROJECT = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))["project"]

PUBLIC_NAMES = [
    "Calibration",
    "CandidatePairs",
    "DetectionLog",
    "Engine",
    "Frame",
    "FrameResult",
    "Kind",
    "MargentError",
    "Settings",
    "TrackState",
    "Tracks",
    "Truth",
    "associate_log",
    "calibrate",
    "compare",
    "diagnose",
    "evaluate",
    "explain",
    "k_best",
    "load_settings",
    "marginals",
    "read_log",
    "read_run",
    "read_truth",
    "register_cost",
    "track_log",
    "write_page",
]

KERNEL = '"""Doc."""\n@njit(cache=True)\ndef f():\n    """Doc."""\n'
TWIN = "def f():\n    return 0\n"

# Rule, files, and what the rule says of each line it finds fault with.
FAULTS = [
    pytest.param(
        rules.short_files,
        {"scripts/a.py": "\n" * 400, "tests/b.py": "\n" * 401},
        ["tests/b.py:401: 401 lines, at most 400"],
        id="long file",
    ),
    pytest.param(
        rules.docstrings,
        {
            "tracker/a.py": "x = 1\n",
            "tracker/b.py": '"""Doc."""\ndef _f(): pass\nclass C: pass\ndef g():\n    """Doc."""\n',
            "tracker/__init__.py": "",
        },
        ["tracker/a.py:1: the module has no docstring", "tracker/b.py:3: C has no docstring"],
        id="docstrings",
    ),
    pytest.param(
        rules.kernel_imports,
        {
            "tracker/kernels/a.py": "import math\nimport numpy as np\nimport numpyro\n"
            "from typing import NamedTuple\nfrom tracker.kernels import b\n"
            "def f():\n    import scipy.stats\n",
            "tracker/kernels/b.py": "from tracker.errors import InputError\nfrom . import a\n"
            "from ..log import model\n",
            "tracker/log/model.py": "",
        },
        [
            "tracker/kernels/a.py:3: a kernel imports numpyro",
            "tracker/kernels/a.py:7: a kernel imports scipy.stats",
            "tracker/kernels/b.py:1: a kernel imports tracker.errors",
            "tracker/kernels/b.py:3: a kernel imports tracker.log.model",
        ],
        id="kernel imports",
    ),
    pytest.param(
        rules.kernel_options,
        {
            "tracker/kernels/a.py": KERNEL
            + "@njit(cache=True, fastmath=True)\ndef g(): ...\n@nb.njit\ndef h(): ...\n"
        },
        [
            "tracker/kernels/a.py:5: @njit(cache=True, fastmath=True)",
            "tracker/kernels/a.py:7: @nb.njit",
        ],
        id="kernel options",
    ),
    pytest.param(
        rules.kernel_twins,
        {
            "tracker/kernels/a.py": KERNEL + KERNEL.replace("f()", "_g()") + "def plain(): ...\n",
            "tracker/kernels/b.py": KERNEL + KERNEL.replace("f()", "g()"),
            "tracker/kernels/frontier.py": KERNEL,
            "tests/reference/b.py": TWIN,
        },
        [
            "tracker/kernels/a.py:3: f has no twin in tests/reference/a.py",
            "tracker/kernels/b.py:7: g has no twin in tests/reference/b.py",
        ],
        id="kernel twins",
    ),
    pytest.param(
        rules.one_way,
        {
            "tracker/__init__.py": "from tracker.engine import Engine\n",
            "tracker/log/model.py": "from tracker.errors import InputError\n",
            "tracker/log/a.py": "def f():\n    from tracker.engine import Engine\n",
            "tracker/motion/a.py": "from tracker.motion.b import x\n"
            "from tracker import association\n",
            "tracker/engine.py": "from tracker.motion import a\nfrom tracker import Settings\n",
            "tracker/results/a.py": "from tracker.results.tracks import Tracks\n",
            "tracker/results/tracks.py": "from . import a\n",
            "tracker/guesses/a.py": "",
            "tracker/association/a.py": "import numpy\n",
        },
        [
            "tracker/engine.py:2: imports tracker, which does not stand below it",
            "tracker/guesses/a.py:1: give guesses.a a place in LAYERS of scripts/rules.py",
            "tracker/log/a.py:2: imports tracker.engine, which does not stand below it",
            "tracker/motion/a.py:2: imports tracker.association, which does not stand below it",
            "tracker/results/tracks.py:1: imports tracker.results.a, which does not stand below it",
        ],
        id="one way",
    ),
    pytest.param(
        rules.top_level,
        {"README.md": "", ".gitignore": "/out/\n*.egg-info/\n", "notes.md": ""}
        | {"out/a.csv": "", "margent.egg-info/x": "", ".venv/x": "", "tracker/a.py": ""},
        ["notes.md:1: not one of the agreed top-level entries, and not ignored by git"],
        id="top level",
    ),
    pytest.param(
        rules.light_help,
        {
            "tracker/__init__.py": "",
            "tracker/cli/__init__.py": "",
            "tracker/cli/main.py": "import scipy\ndef run(words): ...\n",
        },
        ["tracker/cli/main.py:1: --help loads scipy"],
        id="light help",
    ),
]


@pytest.mark.parametrize(("rule", "files", "found"), FAULTS)
def test_a_rule_finds_the_faults(rule, files, found, tmp_path):
    for name, text in files.items():
        path = tmp_path / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_text(text)
    assert list(rule(tmp_path)) == found


def test_every_rule_is_tried_here():
    assert {case.values[0] for case in FAULTS} == set(rules.RULES)


def test_help_that_fails_is_a_fault_too(tmp_path):
    for name in ("tracker/__init__.py", "tracker/cli/__init__.py"):
        (tmp_path / name).parent.mkdir()
        (tmp_path / name).touch()
    (tmp_path / "tracker/cli/main.py").write_text("raise RuntimeError('no help')\n")
    assert list(rules.light_help(tmp_path)) == [
        "tracker/cli/main.py:1: --help fails: RuntimeError: no help"
    ]


def test_public_names():
    assert tracker.__all__ == PUBLIC_NAMES
    assert dir(tracker) == PUBLIC_NAMES
    assert all(getattr(tracker, name) is not None for name in PUBLIC_NAMES)
    with pytest.raises(AttributeError, match="no attribute 'Tracker'"):
        _ = tracker.Tracker


def test_what_is_needed_is_pinned_and_nothing_else():
    """Directly or through others; a package without a pin could change under the tests."""
    text = (ROOT / "scripts" / "constraints.txt").read_text(encoding="utf-8")
    pins = dict(line.split("==") for line in text.splitlines() if not line.startswith("#"))
    pins = {canonicalize_name(name): release for name, release in pins.items()}
    installed = {canonicalize_name(item.name): item.version for item in distributions()}
    if not pins.items() <= installed.items():
        pytest.skip("not the environment that scripts/test.py makes")
    waiting, seen = [Requirement("margent[test]")], set()
    while waiting:
        need = waiting.pop()
        if str(need) not in seen:
            seen.add(str(need))
            waiting += _needs_of(need)
    names = {canonicalize_name(Requirement(text).name) for text in seen}
    assert names - {"margent"} == set(pins)


def _needs_of(package: Requirement) -> Iterator[Requirement]:
    extras = package.extras or {""}
    for text in requires(package.name) or ():
        need = Requirement(text)
        if not need.marker or any(need.marker.evaluate({"extra": extra}) for extra in extras):
            yield need


def test_the_changelog_knows_this_version():
    text = (ROOT / "CHANGELOG.md").read_text(encoding="utf-8")
    assert re.findall(r"^## (\S+)", text, re.MULTILINE)[0] == PROJECT["version"]


def test_the_contributors_guide_names_every_part():
    text = (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8")
    folders = [f"{item.parent.name}/" for item in (ROOT / "tracker").glob("*/__init__.py")]
    files = [item.name for item in (ROOT / "tracker").glob("[!_]*.py")]
    assert [name for name in (*folders, *files) if name not in text] == []


@pytest.mark.parametrize("name", ["environment", "demo", "test", "check"])
def test_an_old_python_can_read_what_it_is_told(name):
    """They say that Python is too old, which takes a Python that gets as far as running them."""
    text = (ROOT / "scripts" / f"{name}.py").read_text(encoding="utf-8")
    ast.parse(text, feature_version=(3, 7))
    assert "from __future__ import annotations" not in text  # unknown before 3.7


@pytest.mark.skipif(os.name == "nt", reason="no such permission there")
def test_the_gate_can_be_run():
    assert os.access(ROOT / ".ci" / "run", os.X_OK)
