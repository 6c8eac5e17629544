"""The small rules that check.py holds the repository to.

Each is a function that takes the repository's folder and yields violations as 'file:line: what';
its docstring is the rule and its reason.
"""

from __future__ import annotations

import ast
import fnmatch
import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path

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
HEAVY = (
    "numba",
    "pandas",
    "cv2",
    "pyarrow",
    "scipy",
    "matplotlib",
    "plotly",
    "optuna",
    "distributed",
)
TYPE_NAMES = ("__future__", "typing", "collections.abc")
KERNEL_IMPORTS = ("numpy", "numba", "math", "tracker.kernels", *TYPE_NAMES)
# No twin: the queue of the shortest-path search. Its users' twins do without one, and checking
# them checks it.
WITHOUT_TWIN = {"frontier.py", "problem_frontier"}
# Lowest first: a part of tracker may import what is in its own package or in an earlier line.
# The longest name that fits decides; DEVELOPERS.md draws the same.
LAYERS = (
    ("errors", "kernels", "executors"),
    ("settings",),
    ("log.model",),
    ("results.tracks", "results.folder", "results.parquet"),
    ("log",),
    ("lifecycle",),
    ("motion",),
    ("association",),
    ("engine",),
    ("results.recorder", "results.table"),
    ("ledger",),
    ("results",),
    ("hindsight",),
    ("offline",),
    ("evaluation", "simulation", "batch"),
    ("comparison", "calibration"),
    ("diagnosis",),
    ("causes",),
    ("tuning",),
    ("report",),
    ("cli",),
)
ROOT_MODULES = ("__init__", "__main__")  # the public names and `python -m tracker`: above all


def short_files(root: Path) -> Iterator[str]:
    """Files stay under 400 lines, so that each has one job."""
    for path in _python(root, "tracker", "tests", "scripts"):
        lines = len(path.read_text(encoding="utf-8").splitlines())
        if lines > LONGEST_FILE:
            yield f"{_name(root, path)}:{lines}: {lines} lines, at most {LONGEST_FILE}"


def docstrings(root: Path) -> Iterator[str]:
    """Each module, public class and public function of tracker/ says what it is for."""
    for path in _python(root, "tracker"):
        tree = _tree(path)
        if tree.body and not ast.get_docstring(tree):
            yield f"{_name(root, path)}:1: the module has no docstring"
        for node in tree.body:
            named = isinstance(node, ast.FunctionDef | ast.AsyncFunctionDef | ast.ClassDef)
            if named and not node.name.startswith("_") and not ast.get_docstring(node):
                yield f"{_name(root, path)}:{node.lineno}: {node.name} has no docstring"


def kernel_imports(root: Path) -> Iterator[str]:
    """Kernels import numpy, numba, math and each other: arrays in, arrays out, tested alone."""
    for path in _python(root, "tracker/kernels"):
        if path.name == "__init__.py":
            continue
        for line, module in _imports(root, path):
            if not any(f"{module}.".startswith(f"{allowed}.") for allowed in KERNEL_IMPORTS):
                yield f"{_name(root, path)}:{line}: a kernel imports {module}"


def kernel_options(root: Path) -> Iterator[str]:
    """Kernels are '@njit(cache=True)' and no more: fastmath and parallel loops change answers."""
    for path in _python(root, "tracker"):
        for node in ast.walk(_tree(path)):
            for used in getattr(node, "decorator_list", ()):
                if _compiles(used) and ast.unparse(used) != "njit(cache=True)":
                    yield f"{_name(root, path)}:{used.lineno}: @{ast.unparse(used)}"


def kernel_twins(root: Path) -> Iterator[str]:
    """Each public kernel has a slow twin of its name in tests/reference/ to be checked against."""
    for path in _python(root, "tracker/kernels"):
        twin = root / "tests" / "reference" / path.name
        known = {item.name for item in _functions(twin)} if twin.is_file() else set()
        for node in _functions(path):
            private = node.name.startswith("_") or not any(map(_compiles, node.decorator_list))
            if private or node.name in known or {path.name, node.name} & WITHOUT_TWIN:
                continue
            where = _name(root, twin)
            yield f"{_name(root, path)}:{node.lineno}: {node.name} has no twin in {where}"


def one_way(root: Path) -> Iterator[str]:
    """Imports point from later stages to earlier ones, never back: the layout reads as the flow."""
    for path in _python(root, "tracker"):
        own = _module(root, path)
        if own in ROOT_MODULES:
            continue
        level = _level(own)
        if level is None:
            yield f"{_name(root, path)}:1: give {own} a place in LAYERS of scripts/rules.py"
            continue
        for line, module in _imports(root, path):
            if module.split(".")[0] != "tracker":
                continue
            other = module.removeprefix("tracker").lstrip(".")
            above = _level(other)
            if other.split(".")[0] == own.split(".")[0] and above == level:
                continue
            if above is None or above >= level:
                yield f"{_name(root, path)}:{line}: imports {module}, which does not stand below it"


def top_level(root: Path) -> Iterator[str]:
    """The top of the repository holds what was agreed, so that a newcomer finds the way."""
    ignored = root / ".gitignore"
    lines = ignored.read_text(encoding="utf-8").split() if ignored.is_file() else []
    patterns = [line.strip("/") for line in lines]
    for name in sorted(item.name for item in root.iterdir()):
        if name.startswith(".") or name in TOP_LEVEL:
            continue
        if not any(fnmatch.fnmatch(name, pattern) for pattern in patterns):
            yield f"{name}:1: not one of the agreed top-level entries, and not ignored by git"


def light_help(root: Path) -> Iterator[str]:
    """'margent --help' answers at once: it loads none of the heavy libraries."""
    code = (
        "import sys; from tracker.cli.main import run; run(['--help']);"
        f"print(*[m for m in {HEAVY!r} if m in sys.modules], file=sys.stderr)"
    )
    done = subprocess.run([sys.executable, "-c", code], cwd=root, capture_output=True, text=True)
    said = done.stderr.strip().splitlines()[-1:]
    if said or done.returncode:
        verb = "fails:" if done.returncode else "loads"
        yield f"tracker/cli/main.py:1: --help {verb} {''.join(said)}"


RULES = (
    short_files,
    docstrings,
    kernel_imports,
    kernel_options,
    kernel_twins,
    one_way,
    top_level,
    light_help,
)


def _python(root: Path, *folders: str) -> list[Path]:
    return sorted(path for folder in folders for path in (root / folder).rglob("*.py"))


def _name(root: Path, path: Path) -> str:
    return path.relative_to(root).as_posix()


def _tree(path: Path) -> ast.Module:
    return ast.parse(path.read_text(encoding="utf-8"))


def _functions(path: Path) -> list[ast.FunctionDef]:
    return [node for node in _tree(path).body if isinstance(node, ast.FunctionDef)]


def _compiles(decorator: ast.expr) -> bool:
    """Whether this is one of numba's decorators, however it was imported."""
    called = decorator.func if isinstance(decorator, ast.Call) else decorator
    return ast.unparse(called).split(".")[-1] in {"njit", "jit", "vectorize", "guvectorize"}


def _module(root: Path, path: Path) -> str:
    """Dotted name within tracker; a package goes by its own name."""
    parts = path.relative_to(root / "tracker").with_suffix("").parts
    return ".".join(parts[:-1] if len(parts) > 1 and parts[-1] == "__init__" else parts)


def _imports(root: Path, path: Path) -> Iterator[tuple[int, str]]:
    """Line and full name of every module imported, at the top, in functions or for types."""
    for node in ast.walk(_tree(path)):
        if isinstance(node, ast.Import):
            yield from ((node.lineno, item.name) for item in node.names)
        elif isinstance(node, ast.ImportFrom):
            base = node.module or ""
            if node.level:  # relative: count up from the folder
                folder = path.parents[node.level - 1].relative_to(root).as_posix()
                base = f"{folder.replace('/', '.')}.{base}".rstrip(".")
            for item in node.names:
                inner = f"{base}.{item.name}"
                place = root / inner.replace(".", "/")
                is_module = place.is_dir() or place.with_suffix(".py").is_file()
                yield node.lineno, inner if is_module else base


def _level(module: str) -> int | None:
    """Number of the line of LAYERS that a module belongs to."""
    parts = module.split(".")
    for length in range(len(parts), 0, -1):
        for number, names in enumerate(LAYERS):
            if ".".join(parts[:length]) in names:
                return number
    return None
