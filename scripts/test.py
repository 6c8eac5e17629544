"""Set up the private environment and run the tests: python3 scripts/test.py [pytest options]"""

import os
import sys

from environment import enter, run

MOST_WORKERS = 4  # each compiles for itself: more would cost more than they save


def main() -> None:
    """Run what was asked for, or everything, spread over the cores."""
    enter("test")
    options = sys.argv[1:] or ["-n", str(min(MOST_WORKERS, os.cpu_count() or 1))]
    sys.exit(run([sys.executable, "-m", "pytest", *options]))


if __name__ == "__main__":
    main()
