"""Verdicts as a JUnit XML report, which continuous integration systems read."""

from __future__ import annotations

import re
from collections.abc import Sequence
from pathlib import Path
from typing import Protocol
from xml.etree import ElementTree

from tracker.errors import OutputError
from tracker.results.folder import atomic_file

SUITE = "margent evaluate"
# What XML 1.0 cannot hold even when escaped.
_FORBIDDEN = re.compile("[^\t\n\r\u0020-\ud7ff\ue000-\ufffd\U00010000-\U0010ffff]")


class Case(Protocol):
    """Something that was met or not.

    where : class name of the test case.   name : what was asked.   message : what was found.
    """

    @property
    def where(self) -> str: ...
    @property
    def name(self) -> str: ...
    @property
    def met(self) -> bool: ...
    @property
    def message(self) -> str: ...


def junit_text(verdicts: Sequence[Case], suite_name: str = SUITE) -> str:
    """One suite with a test case a limit; those not met are failures.

    Elements and attributes are those that the common schema of JUnit reports requires. There is
    no time of day in it, so that equal results have equal bytes.
    """
    failures = sum(not verdict.met for verdict in verdicts)
    counts = {
        "name": suite_name,
        "tests": str(len(verdicts)),
        "failures": str(failures),
        "errors": "0",
        "time": "0",
    }
    suites = ElementTree.Element("testsuites", counts)
    suite = ElementTree.SubElement(suites, "testsuite", counts | {"skipped": "0"})
    for verdict in verdicts:
        case = ElementTree.SubElement(
            suite,
            "testcase",
            {"classname": _clean(verdict.where), "name": verdict.name, "time": "0"},
        )
        if not verdict.met:
            failure = ElementTree.SubElement(
                case, "failure", {"message": verdict.message, "type": "limit"}
            )
            failure.text = verdict.message
    ElementTree.indent(suites)
    return (
        '<?xml version="1.0" encoding="UTF-8"?>\n'
        + ElementTree.tostring(suites, encoding="unicode")
        + "\n"
    )


def write_junit(path: Path, verdicts: Sequence[Case], suite_name: str = SUITE) -> None:
    """Write the report; it appears complete or not at all.

    Raises OutputError where it cannot be written.
    """
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
    except OSError as error:
        raise OutputError(f"cannot be written: {error.strerror}", path=path) from None
    with atomic_file(path) as working:
        working.write_text(junit_text(verdicts, suite_name), encoding="utf-8")


def _clean(text: str) -> str:
    return _FORBIDDEN.sub("?", text)
