"""Assemble the commands and turn every error into a sentence and an exit code.

Nothing heavy is imported here or at the top of a command's file: `margent --help` must answer
at once. Each command imports what it needs inside its function.
"""

from __future__ import annotations

import errno
import json
import os
import sys
import tempfile
import traceback
from collections.abc import Sequence

import typer

from tracker.cli.associate import associate
from tracker.cli.calibrate import calibrate
from tracker.cli.compare import compare
from tracker.cli.evaluate import evaluate
from tracker.cli.explain import explain
from tracker.cli.inspect import inspect
from tracker.cli.report import report
from tracker.cli.simulate import simulate
from tracker.errors import EXIT_DONE, EXIT_INTERNAL, EXIT_USAGE, CertificateError, MargentError

INTERRUPTED = 130

app = typer.Typer(
    name="margent",
    help=(
        "Turn detections without identity into tracks, score them against truth, and explain "
        "every decision."
    ),
    epilog=(
        "Tracks can be wrong, and tracks of people are personal data: follow the law and the "
        "safety practice that apply where you are."
    ),
    no_args_is_help=True,
    add_completion=False,
    rich_markup_mode=None,
    pretty_exceptions_enable=False,
)
for command in (associate, calibrate, compare, evaluate, explain, inspect, report, simulate):
    app.command()(command)


def main(arguments: Sequence[str] | None = None) -> None:
    """Entry point of the `margent` command; always leaves through SystemExit."""
    sys.exit(run(arguments))


def run(arguments: Sequence[str] | None = None) -> int:
    """Run one command line and return its exit code (0, 1, 2, 3 or 130)."""
    try:
        outcome = app(args=arguments, standalone_mode=False)
        return outcome if isinstance(outcome, int) else EXIT_DONE
    except typer.Exit as leave:
        return int(leave.exit_code)
    except CertificateError as error:
        return _report_proof(error)
    except MargentError as error:
        _say(str(error))
        return error.exit_code
    except (KeyboardInterrupt, typer.Abort):
        _say("stopped before the end; nothing half-written was left behind")
        return INTERRUPTED
    except BrokenPipeError:
        # The reader (head, less) went away: not an error, but stdout must not be flushed again.
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return EXIT_DONE
    except OSError as error:
        _say(_explain_os_error(error))
        return EXIT_USAGE
    except Exception as error:
        if hasattr(error, "format_message") and hasattr(error, "exit_code"):  # typer's usage errors
            _say(error.format_message())
            return EXIT_USAGE
        return _report_internal(error)


def _say(sentence: str) -> None:
    print(f"margent: {sentence}", file=sys.stderr)


def _explain_os_error(error: OSError) -> str:
    where = f"{error.filename}: " if error.filename else ""
    if error.errno == errno.ENOSPC:
        return f"{where}the disk is full; nothing half-written was left behind"
    return f"{where}{error.strerror or error}"


def _report_proof(error: CertificateError) -> int:
    """Keep the component that was not proved optimal, for a bug report."""
    with tempfile.NamedTemporaryFile(
        "w", prefix="margent-component-", suffix=".json", delete=False, encoding="utf-8"
    ) as file:
        json.dump(error.evidence, file, indent=1)
    _say(f"internal error: {error}. Please report it with {file.name}, which has the component.")
    return error.exit_code


def _report_internal(error: Exception) -> int:
    """Keep the traceback in a file: the user gets a sentence, the developer gets everything."""
    with tempfile.NamedTemporaryFile(
        "w", prefix="margent-error-", suffix=".txt", delete=False, encoding="utf-8"
    ) as file:
        file.write(" ".join(sys.argv) + "\n\n")
        file.write("".join(traceback.format_exception(error)))
    _say(
        f"internal error: {type(error).__name__}: {error}. Please report it with {file.name} "
        "(it may contain parts of your paths and data)."
    )
    return EXIT_INTERNAL
