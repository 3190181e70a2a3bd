"""The only place that touches the terminal: standard output, standard error, their width and colour."""

from __future__ import annotations

import os
import shutil
import sys
from typing import TextIO

from beforehand.faults import WriteError

# A page without a terminal (a pipe, a file) is made as wide as a reader likes to have it.
WIDTH_WITHOUT_TERMINAL = 100
NARROWEST, WIDEST = 40, 140


def width() -> int:
    """Cells of a line of output; the environment's COLUMNS goes before the terminal's own."""
    columns = shutil.get_terminal_size((WIDTH_WITHOUT_TERMINAL, 24)).columns
    return max(NARROWEST, min(WIDEST, columns))


def colour() -> bool:
    """Whether output may be coloured: to a terminal only, and never against NO_COLOR."""
    plain = bool(os.environ.get("NO_COLOR")) or os.environ.get("TERM") == "dumb"
    return not plain and is_terminal(sys.stdout)


def is_terminal(stream: TextIO | None) -> bool:
    """Whether a stream is shown to a person as it is written."""
    return stream is not None and not stream.closed and stream.isatty()


def say(text: str) -> None:
    """Write a text for people to standard output; signs that it cannot show become ``?``."""
    stream = sys.stdout
    if stream is not None:
        encoding = stream.encoding or "utf-8"
        _write(stream, text.encode(encoding, "replace").decode(encoding))


def document(text: str) -> None:
    """Write a text for programs to standard output, as UTF-8 with plain line ends on every system."""
    stream = sys.stdout
    if stream is None:
        return
    binary = getattr(stream, "buffer", None)
    if binary is None:
        _write(stream, text)
        return
    try:
        stream.flush()
        binary.write(text.encode("utf-8"))
        binary.flush()
    except OSError as error:
        _unwritten(error)


def note(text: str) -> None:
    """Write a line to standard error; one that nobody can read is no reason to fail."""
    stream = sys.stderr
    if stream is None:
        return
    encoding = stream.encoding or "utf-8"
    try:
        stream.write(text.encode(encoding, "backslashreplace").decode(encoding) + "\n")
        stream.flush()
    except OSError:
        _silence(2)


def _write(stream: TextIO, text: str) -> None:
    """Write and flush, so that a full disk is found here and not after the program's end."""
    try:
        stream.write(text)
        stream.flush()
    except OSError as error:
        _unwritten(error)


def _unwritten(error: OSError) -> None:
    """A reader that has gone (``| head``) is no fault; a full disk behind the output is one."""
    _silence(1)
    if not isinstance(error, BrokenPipeError):
        raise WriteError(f"standard output: cannot be written: {error.strerror or error}") from error


def _silence(descriptor: int) -> None:
    """Point a stream nowhere, so that what is left in its buffer does not complain at the end."""
    try:
        nowhere = os.open(os.devnull, os.O_WRONLY)
        os.dup2(nowhere, descriptor)
        os.close(nowhere)
    except OSError:
        pass
