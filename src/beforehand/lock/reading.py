"""From a lockfile to the lock, or to the one line that says why not."""

from __future__ import annotations

import os

from beforehand.lock.models import LOCK_VERSION, Lock
from beforehand.lock.opening import FileKind, record_of

# A lock of a hundred thousand fits stays below it; beyond, a file is something else.
LARGEST_LOCK = 2**30

KIND = FileKind(key="lock", file="lockfile", version=LOCK_VERSION, again="run the plan again")


def read_lock(path: str | os.PathLike[str]) -> Lock:
    """Read a lockfile.

    Parameters
    ----------
    path : path
        The file.

    Returns
    -------
    Lock
        The lock; writing it gives the bytes of the file.

    Raises
    ------
    LockError
        There is no such file, it was changed after it was written, it is cut short, it is of a
        newer version, or it is no lock.
    """
    return lock_from_bytes(KIND.bytes_of(path, LARGEST_LOCK), os.fspath(path))


def lock_from_text(text: str, name: str) -> Lock:
    """Read a lock from its text.

    Parameters
    ----------
    text : str
        The whole text of a lockfile.
    name : str
        How faults name it.

    Returns
    -------
    Lock
        The lock; writing it gives the same text.

    Raises
    ------
    LockError
        As of `read_lock`.
    """
    return lock_from_bytes(text.encode("utf-8", "surrogatepass"), name)


def lock_from_bytes(data: bytes, name: str) -> Lock:
    """Read a lock from the bytes of its file.

    Parameters
    ----------
    data : bytes
        All of them.
    name : str
        How faults name the file.

    Returns
    -------
    Lock
        The lock; writing it gives the same bytes.

    Raises
    ------
    LockError
        As of `read_lock`.
    """
    return record_of(data, name, KIND, Lock)
