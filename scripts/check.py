"""Style, types and this project's own small rules: python3 scripts/check.py"""

import sys

from environment import ROOT, enter, run
from rules import RULES

TOOLS = (["ruff", "check"], ["ruff", "format", "--check"], ["mypy"])


def main() -> None:
    """Look at everything, print every violation, and fail if there is any."""
    enter("test")
    failed = False
    for rule in RULES:
        found = list(rule(ROOT))
        print(f"{'FAIL' if found else 'ok  '} {rule.__doc__}")
        print("".join(f"     {line}\n" for line in found), end="", flush=True)
        failed |= bool(found)
    for tool in TOOLS:
        failed |= run([sys.executable, "-m", *tool]) != 0
    sys.exit(1 if failed else 0)


if __name__ == "__main__":
    main()
