"""The `margent` command: one file a command, all of them thin."""

from tracker.cli.main import main

__all__ = ["main"]
