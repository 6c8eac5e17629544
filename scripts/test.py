"""Set up the private environment and run the tests: python3 scripts/test.py [pytest options]"""

from __future__ import annotations

import os
import subprocess
import sys

from environment import ROOT, enter


def main() -> None:
    enter("test")
    options = sys.argv[1:] or ["-n", str(min(4, os.cpu_count() or 1))]
    command = [sys.executable, "-m", "pytest", *options]
    sys.exit(subprocess.run(command, cwd=ROOT, check=False).returncode)


if __name__ == "__main__":
    main()
