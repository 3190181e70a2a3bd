"""One writer at a time: the folder is held while a file in it is appended to."""

from __future__ import annotations

import contextlib
import os
import time
from collections.abc import Iterator
from pathlib import Path

from beforehand.faults import WriteError

# A writer holds the lock for milliseconds; one that has not let go by then has stopped.
LONGEST_WAIT = 30.0
_STEP = 0.02


def require_writable(path: Path) -> None:
    """Make sure that a file can be appended to, before anything is computed for it.

    Raises
    ------
    WriteError
        Its folder is not there or does not permit writing.
    """
    if not path.parent.is_dir():
        raise WriteError(f"{path}: cannot be written: its folder does not exist")
    if not os.access(path.parent, os.W_OK):
        raise WriteError(f"{path}: cannot be written: its folder does not permit writing")


@contextlib.contextmanager
def held(path: Path) -> Iterator[None]:
    """Hold a file against other writers of this program while something is appended to it.

    The system takes the lock back when a process ends, however it ends, so that none is left behind.

    Raises
    ------
    WriteError
        The folder cannot be opened, or another process does not let go.
    """
    try:
        # The folder itself is held where the system can, so that no file is left beside the plan.
        if os.name == "nt":
            handle = os.open(path.with_name(f".{path.name}.held"), os.O_RDWR | os.O_CREAT, 0o666)
        else:
            handle = os.open(path.parent, os.O_RDONLY)
    except OSError as error:
        reason = (error.strerror or "the system refuses").lower()
        raise WriteError(f"{path}: cannot be written: {reason}") from error
    try:
        _wait(handle, path)
        yield
    finally:
        os.close(handle)


def _wait(handle: int, path: Path) -> None:
    """Take the lock, or give up after a while."""
    end = time.monotonic() + LONGEST_WAIT
    while not _taken(handle):
        if time.monotonic() > end:
            raise WriteError(f"{path}: cannot be written: another process holds it; try again")
        time.sleep(_STEP)


def _taken(handle: int) -> bool:
    """Try once to take the lock."""
    try:
        if os.name == "nt":
            import msvcrt

            msvcrt.locking(handle, msvcrt.LK_NBLCK, 1)  # type: ignore[attr-defined,unused-ignore]
        else:
            import fcntl

            fcntl.flock(handle, fcntl.LOCK_EX | fcntl.LOCK_NB)
    except OSError:
        return False
    return True
