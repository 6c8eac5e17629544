"""The private environment that demo.py, test.py and check.py run in.

It lives in .venv beside pyproject.toml and is made again whenever pyproject.toml or
constraints.txt change. Only the standard library is used here.
"""

from __future__ import annotations

import hashlib
import os
import subprocess
import sys
from pathlib import Path

ROOT = Path(__file__).resolve().parent.parent
CONSTRAINTS = ROOT / "scripts" / "constraints.txt"
FOLDER = ROOT / ".venv"
OLDEST_PYTHON = (3, 11)


def enter(extra: str = "") -> None:
    """Go on in the private environment, made first if need be; returns only inside it.

    extra : optional dependencies to have, such as 'test'.
    """
    if sys.version_info < OLDEST_PYTHON:
        sys.exit(f"Margent needs Python 3.11 or newer, this is {sys.version.split()[0]}.")
    python = FOLDER / ("Scripts/python.exe" if os.name == "nt" else "bin/python")
    stamp = FOLDER / f"margent-{extra or 'plain'}.stamp"
    wanted = _fingerprint()
    if not stamp.is_file() or stamp.read_text() != wanted:
        _make(python, extra)
        stamp.write_text(wanted)
    if Path(sys.prefix).resolve() != FOLDER.resolve():
        command = [str(python), *sys.argv]
        sys.exit(subprocess.run(command, cwd=ROOT, check=False).returncode)


def _fingerprint() -> str:
    text = (ROOT / "pyproject.toml").read_bytes() + CONSTRAINTS.read_bytes()
    return hashlib.sha256(text + sys.version.encode()).hexdigest()


def _make(python: Path, extra: str) -> None:
    print(f"Setting up a private environment in {FOLDER} (a minute or two, once) ...", flush=True)
    if not python.is_file():
        _run([sys.executable, "-m", "venv", str(FOLDER)], "venv is missing (Debian: python3-venv)")
    target = f"{ROOT}[{extra}]" if extra else str(ROOT)
    options = ["--quiet", "--disable-pip-version-check", "--constraint", str(CONSTRAINTS)]
    _run(
        [str(python), "-m", "pip", "install", *options, "--editable", target],
        "packages could not be installed; is there a network or a package index?",
    )


def _run(command: list[str], trouble: str) -> None:
    done = subprocess.run(command, cwd=ROOT, check=False)
    if done.returncode:
        sys.exit(f"Set-up failed: {trouble}")
