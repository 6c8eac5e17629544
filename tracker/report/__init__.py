"""Runs made visible: one page that opens from disk."""

from tracker.report.page import write_page

__all__ = ["write_page"]
