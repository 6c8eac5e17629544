"""The private environment that demo.py, test.py and check.py run in.

It lives in .venv beside pyproject.toml and is brought up to date when pyproject.toml or
constraints.txt change. Standard library only, in words that Python 3.6 can read as well: an old
Python is told what is missing instead of failing at the syntax.
"""

import hashlib
import os
import subprocess
import sys
from importlib.util import find_spec
from pathlib import Path

ROOT = Path(__file__).resolve().parent.parent
CONSTRAINTS = ROOT / "scripts" / "constraints.txt"
FOLDER = ROOT / ".venv"
PYTHON = FOLDER / ("Scripts/python.exe" if os.name == "nt" else "bin/python")
OLDEST_PYTHON = (3, 11)
STOPPED = 130

if sys.version_info < OLDEST_PYTHON:
    sys.exit(
        f"Margent needs Python 3.11 or newer; {sys.executable} is {sys.version.split()[0]}. "
        "Try python3.11, python3.12 or python3.13 in place of python3."
    )


def enter(extra: str = "") -> None:
    """Go on in the private environment, made first if need be; returns only inside it.

    extra : optional dependencies to have, such as 'test'.
    """
    inside = Path(sys.prefix).resolve() == FOLDER.resolve()
    if not inside:
        _make()
    _install(extra)
    if not inside:
        sys.exit(run([str(PYTHON), str(Path(sys.argv[0]).resolve()), *sys.argv[1:]]))


def run(command: list[str]) -> int:
    """Run a command at the top of the repository and return its exit code."""
    try:
        return subprocess.run(command, cwd=str(ROOT), check=False).returncode
    except KeyboardInterrupt:
        return STOPPED


def _make() -> None:
    """Make the environment, unless there is one; one whose Python is gone is made again."""
    found = _version_inside()
    if found:
        if found != "{}.{}".format(*sys.version_info):
            print(f"Going on with Python {found} of {FOLDER}; delete that folder to change it.")
        return
    for module in ("venv", "ensurepip"):
        if find_spec(module) is None:
            _give_up(
                f"this Python lacks the module {module}. On Debian and Ubuntu: "
                "apt install python3-venv"
            )
    print(f"Making a private environment in {FOLDER} ...", flush=True)
    gone = (FOLDER / "pyvenv.cfg").is_file() and not PYTHON.is_file()
    command = [sys.executable, "-m", "venv", *(["--clear"] if gone else []), str(FOLDER)]
    _must(command, f"{FOLDER} could not be made. May it be written, and is the disk full?")


def _version_inside() -> str:
    """The environment's Python version, or nothing if it does not run or has no pip."""
    if not PYTHON.is_file():
        return ""
    probe = "import sys, pip; print('{}.{}'.format(*sys.version_info))"
    done = subprocess.run([str(PYTHON), "-c", probe], capture_output=True, text=True, check=False)
    return done.stdout.strip()


def _install(extra: str) -> None:
    """Install the package with the pinned versions, unless that was done. Any extra will do
    where none is asked for."""
    settled = ROOT / "pyproject.toml", CONSTRAINTS
    wanted = hashlib.sha256(b"".join(file.read_bytes() for file in settled) + bytes(ROOT))
    stamps = FOLDER.glob(f"margent-{extra or '*'}.stamp")
    if any(stamp.read_text() == wanted.hexdigest() for stamp in stamps):
        return
    print("Installing the packages pinned in scripts/constraints.txt (a minute or two) ...")
    sys.stdout.flush()
    target = f"{ROOT}[{extra}]" if extra else str(ROOT)
    pip = [str(PYTHON), "-m", "pip", "install", "--quiet", "--disable-pip-version-check"]
    _must(
        [*pip, "--constraint", str(CONSTRAINTS), "--editable", target],
        "packages could not be installed, see above. Mostly there is no way to the package "
        "index: check the network, or set HTTPS_PROXY or PIP_INDEX_URL.",
    )
    (FOLDER / f"margent-{extra or 'plain'}.stamp").write_text(wanted.hexdigest())


def _must(command: list[str], trouble: str) -> None:
    code = run(command)
    if code == STOPPED:
        sys.exit(STOPPED)
    if code:
        _give_up(trouble)


def _give_up(trouble: str) -> None:
    sys.exit(f"Set-up failed: {trouble}")
