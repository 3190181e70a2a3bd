"""From a lockfile to the lock, or to the one line that says why not.

The version is looked at first, then the digest over the bytes, then the content. A lock is taken
only in the layout in which it is written: what has been read is written again and must give the
same bytes, so that nothing in the file can mean anything but what it shows.
"""

from __future__ import annotations

import os
import re
from pathlib import Path

from pydantic import ValidationError

from beforehand.faults import Fault, LockError
from beforehand.lock.layout import LayoutError, json_of
from beforehand.lock.models import LOCK_VERSION, Lock
from beforehand.lock.writing import DIGEST_ENDS_AT, digest_of, lock_text

# A lock of a hundred thousand fits stays below it; beyond, a file is something else.
LARGEST_LOCK = 2**30

# So many faults are told one by one.
_TOLD = 20

_VERSION = re.compile(rb"(?:#[^\n]*\n)*lock: (\d{1,9})\n")
_DIGEST_LINE = re.compile(rb'\ndigest: "(sha256:[0-9a-f]{64})"\n\Z')
_JSON_LINE = re.compile(r"line (\d+)")
_COVERED_ENDS = f"\n{DIGEST_ENDS_AT}".encode()
_MERGE_MARK = re.compile(rb"^(?:<{7}|={7}|>{7})(?: |$)", re.MULTILINE)


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
    name = os.fspath(path)
    try:
        size = os.stat(path).st_size
        if size > LARGEST_LOCK:
            raise _refused(name, "too_large", f"it has {size:,} bytes; a lock has at most {LARGEST_LOCK:,}")
        data = Path(path).read_bytes()
    except FileNotFoundError as error:
        raise _refused(name, "no_file", "there is no such file") from error
    except IsADirectoryError as error:
        raise _refused(name, "no_file", "it is a folder, not a lockfile") from error
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or str(error)
        raise _refused(name, "no_file", f"it cannot be read: {reason.lower()}") from error
    return lock_from_bytes(data, name)


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
    _check_version(data, name)
    _check_digest(data, name)
    try:
        text = data.decode()
    except UnicodeDecodeError as error:
        line = data.count(b"\n", 0, error.start) + 1
        raise _refused(name, "encoding", "it is not UTF-8", line) from error
    lines = text.split("\n")
    comments = next(place for place, line in enumerate(lines) if not line.startswith("#"))
    try:
        content = json_of(lines[comments:-1], comments + 1)
    except LayoutError as error:
        raise _refused(name, "layout", f"not the layout of a lock: {error.what}", error.line) from error
    try:
        lock = Lock.model_validate_json(content)
    except ValidationError as error:
        raise LockError(_faults(error, name, comments)) from error
    again = lock_text(lock)
    if again != text:
        written = enumerate(zip(again.split("\n"), lines, strict=False), 1)
        line = next((number for number, (should, is_) in written if should != is_), 1)
        raise _refused(name, "layout", "not the layout in which a lock is written", line)
    return lock


def _check_version(data: bytes, name: str) -> None:
    """Refuse what is no lock, or one of another version of its language."""
    found = _VERSION.match(data.replace(b"\r\n", b"\n") if b"\r\n" in data[:1000] else data)
    if found is None:
        if _MERGE_MARK.search(data[:1000]):
            raise _refused(name, "merge", "it holds an unfinished merge; take one side or run the plan again")
        raise _refused(name, "no_lock", f"it is no lockfile: it does not begin with 'lock: {LOCK_VERSION}'")
    version = int(found.group(1))
    if version != LOCK_VERSION:
        newer = "a newer program wrote it" if version > LOCK_VERSION else "there is no such version"
        what = f"it is of version {version} of the lock, this program reads {LOCK_VERSION}: {newer}"
        raise _refused(name, "version", what)


def _check_digest(data: bytes, name: str) -> None:
    """Refuse a file that is not whole, or of which a covered byte is not as written."""
    if b"\r\n" in data:
        # Version control may do this on its own; the digest would only say that something changed.
        raise _refused(
            name, "line_ends", "its line ends were changed to CRLF; store it as it was written, with LF"
        )
    if _MERGE_MARK.search(data):
        raise _refused(name, "merge", "it holds an unfinished merge; take one side or run the plan again")
    stated = _DIGEST_LINE.search(data)
    if stated is None:
        raise _refused(name, "cut_short", "it is cut short: its last line should be its digest")
    end = data.find(_COVERED_ENDS)
    if end < 0 or digest_of(data[: end + 1]) != stated.group(1).decode():
        what = "it was changed after it was written: its digest does not fit"
        raise _refused(name, "digest", what)


def _refused(name: str, code: str, what: str, line: int | None = None) -> LockError:
    """Make the error of one fault about the file as a whole or one of its lines."""
    return LockError([Fault(file=name, line=line, place="", what=what, code=f"lock.{code}")])


def _faults(error: ValidationError, name: str, lines_before: int) -> list[Fault]:
    """Turn what the models found into faults, each with its place or its line."""
    found = error.errors(include_url=False, include_input=False, include_context=False)
    if found[0]["type"] == "json_invalid":
        at = _JSON_LINE.search(found[0]["msg"])
        line = None if at is None else int(at.group(1)) + lines_before
        what = "not the layout of a lock: a value on it cannot be read"
        return [Fault(file=name, line=line, place="", what=what, code="lock.layout")]
    faults = [
        Fault(file=name, line=None, place=_place(one["loc"]), what=one["msg"], code=f"lock.{one['type']}")
        for one in found[:_TOLD]
    ]
    if len(found) > _TOLD:
        more = f"and {len(found) - _TOLD} more of the kind"
        faults.append(Fault(file=name, line=None, place="", what=more, code="lock.more"))
    return faults


def _place(steps: tuple[int | str, ...]) -> str:
    """Write the place of a field as a path."""
    path = "".join(f"[{step}]" if isinstance(step, int) else f".{step}" for step in steps)
    return path.removeprefix(".")
