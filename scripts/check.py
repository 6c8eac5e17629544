"""Style, types and this project's own small rules: python3 scripts/check.py

Each rule is a function whose docstring is the rule and its reason.
"""

from __future__ import annotations

import ast
import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path

from environment import ROOT, enter

LONGEST_FILE = 400
TOP_LEVEL = {
    "README.md",
    "DEVELOPERS.md",
    "CHANGELOG.md",
    "LICENSE",
    "pyproject.toml",
    "tracker",
    "tests",
    "scripts",
    "sample_sequences",
}
HEAVY = ("numba", "pandas", "cv2", "pyarrow", "scipy", "matplotlib")
KERNEL_IMPORTS = (
    "numpy",
    "numba",
    "math",
    "typing",
    "collections",
    "__future__",
    "tracker.kernels",
)
# What a package may import of tracker: data flows one way (DEVELOPERS.md draws it).
LAYERS = (
    {"errors", "kernels"},
    {"settings"},
    {"log"},
    {"motion", "lifecycle", "association", "results.tracks", "results.folder"},
    {"engine"},
    {"ledger", "results"},
    {"offline", "evaluation", "simulation"},
    {"diagnosis", "batch"},
    {"cli"},
)


def python_files(*folders: str) -> list[Path]:
    """Tracked or new Python files below the folders."""
    return sorted(path for folder in folders for path in (ROOT / folder).rglob("*.py"))


def short_files() -> Iterator[str]:
    """Files stay under 400 lines, so that each has one job."""
    for path in python_files("tracker", "tests", "scripts"):
        lines = len(path.read_text(encoding="utf-8").splitlines())
        if lines > LONGEST_FILE:
            yield f"{_name(path)}:{lines}: {lines} lines, at most {LONGEST_FILE}"


def docstrings() -> Iterator[str]:
    """Every module, public class and public function in tracker/ says what it is."""
    for path in python_files("tracker"):
        tree = _tree(path)
        if not ast.get_docstring(tree) and path.read_text(encoding="utf-8").strip():
            yield f"{_name(path)}:1: module without a docstring"
        for node in tree.body:
            if not isinstance(node, (ast.FunctionDef, ast.ClassDef)) or node.name[0] == "_":
                continue
            if not ast.get_docstring(node):
                yield f"{_name(path)}:{node.lineno}: {node.name} has no docstring"


def kernel_boundary() -> Iterator[str]:
    """Kernels import numpy, numba and each other only: they stay testable and fast."""
    for path in python_files("tracker/kernels"):
        if path.name == "__init__.py":
            continue
        for line, module in _imports(path):
            if not any(module == good or module.startswith(good + ".") for good in KERNEL_IMPORTS):
                yield f"{_name(path)}:{line}: a kernel imports {module}"


def kernel_twins() -> Iterator[str]:
    """Each public kernel has a slow twin of its name in tests/reference/, to be checked against."""
    for path in python_files("tracker/kernels"):
        twin = ROOT / "tests" / "reference" / path.name
        known = set()
        if twin.is_file():
            known = {node.name for node in _tree(twin).body if isinstance(node, ast.FunctionDef)}
        for node in _tree(path).body:
            if not isinstance(node, ast.FunctionDef) or node.name[0] == "_":
                continue
            if any("njit" in ast.unparse(item) for item in node.decorator_list):
                scratch = node.name.startswith(("new_", "clear", "offer", "nearest", "prefers_"))
                if node.name not in known and not scratch and "frontier" not in node.name:
                    yield f"{_name(path)}:{node.lineno}: no twin {node.name} in {_name(twin)}"


def one_way() -> Iterator[str]:
    """Imports point from later stages to earlier ones, never back: the layout reads as the flow."""
    for path in python_files("tracker"):
        own = _layer(".".join(path.relative_to(ROOT / "tracker").with_suffix("").parts))
        if own is None:
            continue
        for line, module in _imports(path, top_only=True):
            if not module.startswith("tracker."):
                continue
            other = _layer(module.removeprefix("tracker."))
            if other is not None and other > own:
                yield f"{_name(path)}:{line}: imports {module}, which stands above it"


def top_level() -> Iterator[str]:
    """The top of the repository holds nothing but what was agreed."""
    listed = subprocess.run(
        ["git", "ls-tree", "--name-only", "HEAD"], cwd=ROOT, capture_output=True, text=True
    )
    for name in listed.stdout.split():
        if name not in TOP_LEVEL and not name.startswith("."):
            yield f"{name}:1: not one of the agreed top-level entries"


def light_help() -> Iterator[str]:
    """`margent --help` answers at once: it imports none of the heavy libraries."""
    code = (
        "import sys; from tracker.cli.main import run; run(['--help']);"
        f"print([m for m in {HEAVY!r} if m in sys.modules], file=sys.stderr)"
    )
    done = subprocess.run([sys.executable, "-c", code], cwd=ROOT, capture_output=True, text=True)
    if done.stderr.strip() != "[]":
        yield f"tracker/cli/main.py:1: --help imports {done.stderr.strip()}"


RULES = (
    short_files,
    docstrings,
    kernel_boundary,
    kernel_twins,
    one_way,
    top_level,
    light_help,
)


def _name(path: Path) -> str:
    return str(path.relative_to(ROOT))


def _tree(path: Path) -> ast.Module:
    return ast.parse(path.read_text(encoding="utf-8"))


def _imports(path: Path, *, top_only: bool = False) -> Iterator[tuple[int, str]]:
    tree = _tree(path)
    for node in tree.body if top_only else ast.walk(tree):
        if isinstance(node, ast.ImportFrom) and node.module:
            yield node.lineno, node.module
        elif isinstance(node, ast.Import):
            for alias in node.names:
                yield node.lineno, alias.name


def _layer(module: str) -> int | None:
    """Number of the layer that a module of tracker belongs to; the longest name decides."""
    parts = module.split(".")
    for length in range(len(parts), 0, -1):
        for number, names in enumerate(LAYERS):
            if ".".join(parts[:length]) in names:
                return number
    return None


def main() -> None:
    enter("test")
    failed = False
    for rule in RULES:
        found = list(rule())
        failed |= bool(found)
        print(f"{'FAIL' if found else 'ok  '} {rule.__doc__}")
        for line in found:
            print(f"     {line}")
    for command in (["ruff", "check"], ["ruff", "format", "--check"], ["mypy"]):
        done = subprocess.run([sys.executable, "-m", *command], cwd=ROOT, check=False)
        failed |= done.returncode != 0
    sys.exit(1 if failed else 0)


if __name__ == "__main__":
    main()
