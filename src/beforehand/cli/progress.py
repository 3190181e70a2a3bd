"""What is being done, on standard error, once it takes longer than a person waits for."""

from __future__ import annotations

import sys
import threading
import time
from types import TracebackType

from beforehand.cli import terminal

# Work that is done within so many seconds is not announced.
PATIENCE = 1.0
REDRAW_EVERY = 0.25
_CLEAR = "\r\x1b[K"


class Progress:
    """Hears messages while work goes on; a context manager around the work.

    Parameters
    ----------
    first : str
        What is being done until the first message comes.
    plain : bool
        Write every message as a line of its own at once, whether or not a terminal listens.
    quiet : bool
        Say nothing.

    Notes
    -----
    To a terminal it is one line that is redrawn and wiped at the end; elsewhere nothing, unless
    ``plain``.
    """

    def __init__(self, first: str, *, plain: bool = False, quiet: bool = False) -> None:
        self._message = first
        self._plain = plain
        self._drawing = not plain and not quiet and terminal.is_terminal(sys.stderr)
        self._started = time.monotonic()
        self._done = threading.Event()
        self._thread: threading.Thread | None = None

    def __enter__(self) -> Progress:
        self._started = time.monotonic()
        if self._plain:
            self(self._message)
        if self._drawing:
            self._thread = threading.Thread(target=self._draw, daemon=True)
            self._thread.start()
        return self

    def __call__(self, message: str) -> None:
        """Take the next message."""
        self._message = message
        if self._plain:
            terminal.note(self._line())

    def __exit__(
        self,
        kind: type[BaseException] | None,
        error: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        self._done.set()
        if self._thread is not None:
            self._thread.join()

    def _line(self) -> str:
        """Seconds since the start, and what is being done."""
        return f"{time.monotonic() - self._started:6.1f} s  {self._message}"

    def _draw(self) -> None:
        """Redraw the line until the work is done, then wipe it."""
        from beforehand.screen.layout import shorten

        if self._done.wait(PATIENCE):
            return
        while True:
            line = shorten(self._line(), terminal.width() - 1)
            sys.stderr.write(_CLEAR + line)
            sys.stderr.flush()
            if self._done.wait(REDRAW_EVERY):
                break
        sys.stderr.write(_CLEAR)
        sys.stderr.flush()
