"""The one place where what was raised becomes a line on standard error and an exit code."""

from __future__ import annotations

import contextlib
import os
import platform
import sys
import traceback
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import typer
from typer.core import TyperCommand, TyperGroup

from beforehand.cli import terminal
from beforehand.faults import EXIT_UNUSABLE, BeforehandError, InputError
from beforehand.version import __version__

# 128 + SIGINT, as shells expect.
EXIT_INTERRUPTED = 130
EXIT_BUG = 1
TRACEBACK_VARIABLE = "BEFOREHAND_TRACEBACK"


class Guarded(TyperGroup):
    """The group of all commands, with every error of theirs told in one line."""

    def invoke(self, ctx: Any) -> Any:
        """Run a command; see :func:`guarded`."""
        with guarded(ctx.params.get("report_bug")):
            return super().invoke(ctx)


class Plain(TyperCommand):
    """A command whose usage line names its arguments without brackets."""

    def collect_usage_pieces(self, ctx: Any) -> list[str]:
        """The parts of the usage line: options, then arguments as they are typed."""
        pieces = super().collect_usage_pieces(ctx)
        return [piece.removesuffix("...").strip("{}") if piece[:1] == "{" else piece for piece in pieces]


@contextlib.contextmanager
def guarded(report: Path | None) -> Iterator[None]:
    """Turn what is raised inside into lines on standard error and an exit code.

    Parameters
    ----------
    report : Path or None
        File that takes the traceback of a bug.

    Raises
    ------
    typer.Exit
        2 for unusable input, 130 for an interrupt, 1 for a bug.
    """
    try:
        yield
    except InputError as error:
        for fault in error.faults:
            terminal.note(_line(str(fault)))
        raise typer.Exit(error.exit_code) from None
    except BeforehandError as error:
        terminal.note(_line(str(error)))
        raise typer.Exit(error.exit_code) from None
    except KeyboardInterrupt:
        terminal.note("interrupted; nothing was written")
        raise typer.Exit(EXIT_INTERRUPTED) from None
    except MemoryError:
        terminal.note("out of memory: the table is too large for this machine; nothing was written")
        raise typer.Exit(EXIT_UNUSABLE) from None
    except (typer.Exit, typer.Abort):
        raise
    except Exception as error:
        # A usage error shows itself: it is the only other kind that knows how.
        if hasattr(error, "show") and hasattr(error, "exit_code"):
            raise
        _tell_bug(error, report)
        raise typer.Exit(EXIT_BUG) from None


def _line(text: str) -> str:
    """A message on one line, whatever stands in it; no sign in it steers a terminal."""
    return "".join(sign if sign.isprintable() else " " if sign.isspace() else "?" for sign in text)


def _tell_bug(error: Exception, report: Path | None) -> None:
    """One line that this is a bug; the traceback only where it was asked for."""
    what = _line(f"{type(error).__name__}: {error}" if str(error) else type(error).__name__)
    told = "".join(traceback.format_exception(error))
    advice = "--report-bug FILE before the command writes a report of it"
    if report is not None:
        advice = _reported(report, told)
    terminal.note(f"this is a bug in beforehand, not in your input: {what}; {advice}")
    if os.environ.get(TRACEBACK_VARIABLE) == "1":
        terminal.note(told.rstrip("\n"))


def _reported(report: Path, told: str) -> str:
    """Write the report; say where it is, or why it is not."""
    from beforehand.cli.targets import refuse_to_replace
    from beforehand.lock.files import write_whole

    lines = [
        f"beforehand {__version__}, python {platform.python_version()}, {platform.system()}",
        f"arguments: {sys.argv[1:]!r}",
        "",
        told,
    ]
    try:
        refuse_to_replace(report, "arguments: ", "a report of a bug")
        write_whole(report, "\n".join(lines).encode("utf-8", "backslashreplace"))
    except BeforehandError as failed:
        return f"no report: {failed}"
    return f"the report is in {report}"
