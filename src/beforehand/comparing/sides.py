"""What stands on each side of a comparison: a plan or a lock, from a file or from git."""

from __future__ import annotations

import os
import re
from dataclasses import dataclass
from pathlib import Path

from beforehand.comparing.locks import plan_of_lock
from beforehand.comparing.revisions import blob, revision_and_path
from beforehand.faults import Fault, InputError, PlanError
from beforehand.lock import Lock, lock_from_bytes
from beforehand.lock.reading import LARGEST_LOCK
from beforehand.lock.writing import covered_text
from beforehand.plan import Plan, PlanOrigin, canonical_text, plan_from_text
from beforehand.plan.yaml_nodes import MOST_BYTES, NotYamlError, decoded

_LOCK_BEGINS = re.compile(rb"(?:#[^\n]*\n)*lock:")


@dataclass(frozen=True, slots=True, kw_only=True)
class Side:
    """One side of a comparison.

    Attributes
    ----------
    name : str
        As the caller named it.
    plan : Plan
        The plan, or the one that is written in the lock.
    lock : Lock or None
        The lock, where the side is one.
    """

    name: str
    plan: Plan
    lock: Lock | None


def read_side(name: str | os.PathLike[str]) -> Side:
    """Read a plan or a lock.

    Parameters
    ----------
    name : str or path
        A file; or ``REVISION:path``, a file in git under the current folder, where no file has that
        name. An empty revision is what is staged.

    Raises
    ------
    InputError
        There is no such file, revision or path, or git cannot be run.
    PlanError, LockError
        With every fault of the file.
    """
    text = os.fspath(name)
    if _is_there(text):
        return _file_side(text)
    found = revision_and_path(text)
    if found is None:
        raise _unusable(text, "there is no such file", "unreadable")
    return _revision_side(text, *found)


def written(side: Side) -> str:
    """One side as text in which only what means something differs, for a tool that compares lines.

    Parameters
    ----------
    side : Side

    Returns
    -------
    str
        A plan with every default; a lock without what it was made with and without its digest.
    """
    return canonical_text(side.plan) if side.lock is None else covered_text(side.lock)


def _is_there(name: str) -> bool:
    """Whether a file has this name; one that no file can have is not there."""
    try:
        return os.path.lexists(name)
    except ValueError:
        return False


def _file_side(name: str) -> Side:
    """A side in a file, which is read once: it may be a pipe."""
    try:
        if Path(name).is_dir():
            raise _unusable(name, "is a folder; a side is a plan or a lock", "unreadable")
        with open(name, "rb") as file:
            data = file.read(MOST_BYTES + 1)
            if _LOCK_BEGINS.match(data):
                data += file.read(LARGEST_LOCK)
    except OSError as problem:
        reason = (problem.strerror or "the system refuses").lower()
        raise _unusable(name, f"cannot be read: {reason}", "unreadable") from None
    return _side(data, name, Path(name))


def _revision_side(name: str, revision: str, path: str) -> Side:
    """A side in git."""
    data = blob(name, revision, path)
    # The plan belongs to the folder of its file: its table stands there, and so do its looks.
    return _side(data, name, Path(path) if Path(path).parent.is_dir() else None)


def _side(data: bytes, name: str, path: Path | None) -> Side:
    """A side from the bytes of its file."""
    if not data.strip():
        # Version control hands over an empty file where one was added or removed.
        raise _unusable(name, "is empty; a comparison needs a plan or a lock on each side", "empty")
    if _LOCK_BEGINS.match(data):
        if len(data) > LARGEST_LOCK:
            raise _unusable(name, f"is larger than {LARGEST_LOCK:,} bytes", "size")
        lock = lock_from_bytes(data, name)
        return Side(name=name, plan=plan_of_lock(lock, name), lock=lock)
    if len(data) > MOST_BYTES:
        raise PlanError([_fault(name, f"is larger than {MOST_BYTES:,} bytes", "size")])
    try:
        plan = plan_from_text(decoded(data), name)
    except NotYamlError as broken:
        raise PlanError([broken.fault.named(name)]) from None
    lines = {} if plan.origin is None else plan.origin.lines
    return Side(name=name, plan=plan.with_origin(PlanOrigin(path=path, name=name, lines=lines)), lock=None)


def _unusable(name: str, what: str, code: str) -> InputError:
    return InputError([_fault(name, what, code)])


def _fault(name: str, what: str, code: str) -> Fault:
    return Fault(file=name, line=None, place="", what=what, code=code)
