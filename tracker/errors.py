"""Everything Margent raises on purpose.

    MargentError
    ├── UsageError              the call makes no sense                     exit 2
    │   └── SettingsError       a setting is unknown or out of its range
    ├── InputError              a file cannot be used as it is              exit 2
    │   └── RejectedRowsError   rows were rejected and --strict was asked
    ├── OutputError             a result cannot be written                  exit 2
    ├── LimitError              a score missed its limit                    exit 1
    └── InternalError           Margent is wrong, please report             exit 3
        ├── CertificateError    an assignment failed its optimality proof
        └── KernelError         a compiled kernel returned a bad status

The data behind the sentence is on the exception (`path`, `line`, `column`, …), so that a
program can act on it; `str(error)` is the sentence for a person and ends with the remedy.
"""

from __future__ import annotations

from pathlib import Path
from typing import Any

EXIT_DONE = 0
EXIT_LIMIT = 1
EXIT_USAGE = 2
EXIT_INTERNAL = 3


class MargentError(Exception):
    """Base of all errors raised on purpose; `exit_code` is what the command line returns."""

    exit_code = EXIT_INTERNAL

    def __reduce__(self) -> tuple[Any, ...]:
        """Errors cross process borders whole, whatever their constructor takes."""
        return _rebuild, (type(self), self.args, self.__dict__)


def _rebuild(kind: type[MargentError], args: tuple[Any, ...], data: dict[str, Any]) -> MargentError:
    error = kind.__new__(kind, *args)
    error.args = args
    error.__dict__.update(data)
    return error


class UsageError(MargentError):
    """The arguments of a call or command contradict each other or are not allowed."""

    exit_code = EXIT_USAGE


class SettingsError(UsageError):
    """A setting is unknown, of the wrong type or out of range.

    `setting` is its path (``gate.probability``), `source` the file or flag it came from.
    """

    def __init__(self, problem: str, *, setting: str = "", source: str = "") -> None:
        self.setting = setting
        self.source = source
        where = ": ".join(part for part in (source, setting) if part)
        super().__init__(f"{where}: {problem}" if where else problem)


class InputError(MargentError):
    """A file is missing, unreadable or not what it should be.

    Reads as ``file, line L, column 'C': problem (found 'VALUE'). Remedy.``
    """

    exit_code = EXIT_USAGE

    def __init__(
        self,
        problem: str,
        *,
        path: str | Path | None = None,
        line: int | None = None,
        column: str | None = None,
        found: str | None = None,
        remedy: str = "",
    ) -> None:
        self.problem = problem
        self.path = None if path is None else Path(path)
        self.line = line
        self.column = column
        self.found = found
        self.remedy = remedy
        super().__init__(self._sentence())

    def _sentence(self) -> str:
        where = []
        if self.path is not None:
            where.append(str(self.path))
        if self.line is not None:
            where.append(f"line {self.line}")
        if self.column is not None:
            where.append(f"column '{self.column}'")
        text = (", ".join(where) + ": " if where else "") + self.problem
        if self.found is not None:
            text += f" (found {self.found!r})"
        return f"{text}. {self.remedy}".rstrip() if self.remedy else text


class RejectedRowsError(InputError):
    """Rows were rejected while ``--strict`` asked for none; `count` says how many."""

    def __init__(self, count: int, *, path: str | Path, first: str) -> None:
        self.count = count
        rows = "row was" if count == 1 else "rows were"
        super().__init__(
            f"{count} {rows} rejected, the first: {first}",
            path=path,
            remedy="Mend the log, or leave out --strict to go on without these rows.",
        )


class OutputError(MargentError):
    """A result could not be written; nothing half-written is left behind."""

    exit_code = EXIT_USAGE

    def __init__(self, problem: str, *, path: str | Path) -> None:
        self.path = Path(path)
        super().__init__(f"{path}: {problem}")


class LimitError(MargentError):
    """A score is outside the limit it was held to."""

    exit_code = EXIT_LIMIT


class InternalError(MargentError):
    """Margent contradicts itself. Please report it with the file the message names."""

    exit_code = EXIT_INTERNAL


class CertificateError(InternalError):
    """The prices do not prove the assignment optimal.

    `gap` is the primal minus the dual value in nats, `violation` the largest amount by which
    a price pair exceeds its cost, both relative to the costs; `evidence` is the component's
    problem and answer in plain values, for a bug report.
    """

    def __init__(
        self,
        message: str,
        *,
        frame: int,
        gap: float,
        violation: float,
        evidence: dict[str, Any] | None = None,
    ) -> None:
        self.frame = frame
        self.gap = gap
        self.violation = violation
        self.evidence = evidence or {}
        super().__init__(f"frame {frame}: {message} (gap {gap:.3g}, violation {violation:.3g})")


class KernelError(InternalError):
    """A compiled kernel returned a status that its caller had excluded."""
