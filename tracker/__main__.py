"""`python -m tracker` is the `margent` command."""

from tracker.cli import main

main()
