"""Set up the private environment and run Margent on a sample: python3 scripts/demo.py"""

import sys

from environment import PYTHON, ROOT, enter, run

SAMPLE = "sample_sequences/forecourt"
RUN = "runs/forecourt"
STEPS = (
    (
        "The mast camera's detections become tracks (the first run compiles for some seconds):",
        f"associate {SAMPLE} --out {RUN}",
    ),
    (
        "The tracks are scored against the truth:",
        f"evaluate {RUN} --truth {SAMPLE}/truth.csv",
    ),
)


def main() -> None:
    """Show each step as a user would type it, and run it."""
    enter()
    for sentence, words in STEPS:
        print(f"\n{sentence}\n$ margent {words}", flush=True)
        code = run([sys.executable, "-m", "tracker", *words.split()])
        if code:
            sys.exit(code)
    command = PYTHON.with_name("margent").relative_to(ROOT)
    print(
        f"\nThe run is in {ROOT / RUN}: tracks.csv, events.csv, rejected.csv, the settings used\n"
        f"and the ledger of decisions. Now your own log: {command} associate LOG --out runs/mine"
    )


if __name__ == "__main__":
    main()
