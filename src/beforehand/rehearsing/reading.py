"""From the file of a rehearsal to its record, or to the one line that says why not."""

from __future__ import annotations

import os
from pathlib import Path

from beforehand.faults import LockError
from beforehand.lock import Lock
from beforehand.lock.opening import FileKind, record_of
from beforehand.names import beside
from beforehand.rehearsing.models import REHEARSAL_VERSION, RehearsalRecord

RECORD_SUFFIX = ".rehearsal.yaml"

# A record of ten thousand predictors with all they have stays below it.
LARGEST_REHEARSAL = 2**28

KIND = FileKind(key="rehearsal", file="rehearsal", version=REHEARSAL_VERSION, again="rehearse the plan again")


def read_rehearsal(path: str | os.PathLike[str]) -> RehearsalRecord:
    """Read the record of a rehearsal.

    Parameters
    ----------
    path : path
        The file.

    Returns
    -------
    RehearsalRecord
        Writing it gives the bytes of the file.

    Raises
    ------
    LockError
        There is no such file, it was changed after it was written, it is cut short, it is of a newer
        version, or it is no rehearsal.
    """
    return rehearsal_from_bytes(KIND.bytes_of(path, LARGEST_REHEARSAL), os.fspath(path))


def rehearsal_beside(lock: Lock, plan: Path) -> RehearsalRecord | None:
    """The rehearsal of a lock's plan and table that stands beside it; None where there is none that fits.

    Parameters
    ----------
    lock : Lock
    plan : Path
        Where the plan's file stands, or would stand.
    """
    path = beside(plan, RECORD_SUFFIX)
    if not path.is_file():
        return None
    try:
        found = read_rehearsal(path)
    except LockError:
        # A rehearsal that cannot be read is a matter of its own; the run is none the worse for it.
        return None
    same_table = found.data is None or found.data.fingerprint == lock.data.fingerprint
    return found if same_table and found.plan.decisions == lock.plan.decisions else None


def rehearsal_from_bytes(data: bytes, name: str) -> RehearsalRecord:
    """Read the record of a rehearsal from the bytes of its file, which faults call ``name``.

    Raises
    ------
    LockError
        As of `read_rehearsal`.
    """
    return record_of(data, name, KIND, RehearsalRecord)
