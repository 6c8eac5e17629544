"""Set up the private environment and run Margent on a sample: python3 scripts/demo.py"""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

from environment import ROOT, enter

SAMPLE = ROOT / "sample_sequences" / "forecourt"
RUN = ROOT / "runs" / "forecourt"


def main() -> None:
    enter()
    margent = [sys.executable, "-m", "tracker"]
    steps = (
        (
            "The mast camera's detections become tracks (the first run compiles, a few seconds):",
            ["associate", str(SAMPLE), "--out", str(RUN)],
        ),
        (
            "The tracks are scored against the truth:",
            ["evaluate", str(RUN), "--truth", str(SAMPLE / "truth.csv")],
        ),
    )
    for sentence, command in steps:
        shown = " ".join(_short(word) for word in command)
        print(f"\n{sentence}\n$ margent {shown}", flush=True)
        done = subprocess.run(margent + command, cwd=ROOT, check=False)
        if done.returncode:
            sys.exit(done.returncode)
    print(f"\nTracks, events and the ledger of decisions are in {_short(str(RUN))}.")


def _short(word: str) -> str:
    path = Path(word)
    return str(path.relative_to(ROOT)) if path.is_absolute() else word


if __name__ == "__main__":
    main()
