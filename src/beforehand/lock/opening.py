"""From the bytes of a record's file to the record, or to the one line that says why not.

The version is looked at first, then the digest over the bytes, then the content. A record is taken
only in the layout in which it is written: what has been read is written again and must give the
same bytes, so that nothing in the file can mean anything but what it shows.
"""

from __future__ import annotations

import os
import re
from dataclasses import dataclass
from pathlib import Path
from typing import TypeVar

from pydantic import ValidationError

from beforehand.faults import Fault, LockError
from beforehand.lock.layout import LayoutError, json_of
from beforehand.lock.record import Record
from beforehand.lock.writing import DIGEST_ENDS_AT, digest_of, record_text

# So many faults are told one by one.
_TOLD = 20

_DIGEST_LINE = re.compile(rb'\ndigest: "(sha256:[0-9a-f]{64})"\n\Z')
_JSON_LINE = re.compile(r"line (\d+)")
_COVERED_ENDS = f"\n{DIGEST_ENDS_AT}".encode()
_MERGE_MARK = re.compile(rb"^(?:<{7}|={7}|>{7})(?: |$)", re.MULTILINE)

Kept = TypeVar("Kept", bound=Record)


@dataclass(frozen=True, slots=True, kw_only=True)
class FileKind:
    """A kind of file that holds one record.

    Attributes
    ----------
    key : str
        First key of the file, whose value is the version; also how faults and their codes call it.
    file : str
        What such a file is called.
    version : int
    again : str
        What to do where a file holds an unfinished merge.
    """

    key: str
    file: str
    version: int
    again: str

    def bytes_of(self, path: str | os.PathLike[str], largest: int) -> bytes:
        """Read a whole file of at most ``largest`` bytes.

        Raises
        ------
        LockError
            There is no such file, it is too large, or it cannot be read.
        """
        name = os.fspath(path)
        try:
            size = os.stat(path).st_size
            if size > largest:
                what = f"it has {size:,} bytes; a {self.key} has at most {largest:,}"
                raise self.refused(name, "too_large", what)
            return Path(path).read_bytes()
        except FileNotFoundError as error:
            raise self.refused(name, "no_file", "there is no such file") from error
        except IsADirectoryError as error:
            raise self.refused(name, "no_file", f"it is a folder, not a {self.file}") from error
        except (OSError, ValueError) as error:
            reason = getattr(error, "strerror", None) or str(error)
            raise self.refused(name, "no_file", f"it cannot be read: {reason.lower()}") from error

    def refused(self, name: str, code: str, what: str, line: int | None = None) -> LockError:
        """Make the error of one fault about a file as a whole or one of its lines."""
        return LockError([Fault(file=name, line=line, place="", what=what, code=f"{self.key}.{code}")])


def record_of(data: bytes, name: str, kind: FileKind, model: type[Kept]) -> Kept:
    """Read a record from the bytes of its file.

    Parameters
    ----------
    data : bytes
        All of them.
    name : str
        How faults name the file.
    kind : FileKind
    model : type
        What the file holds.

    Raises
    ------
    LockError
        It was changed after it was written, it is cut short, it is of a newer version, or it is
        another kind of file.
    """
    _check_version(data, name, kind)
    _check_digest(data, name, kind)
    try:
        text = data.decode()
    except UnicodeDecodeError as error:
        line = data.count(b"\n", 0, error.start) + 1
        raise kind.refused(name, "encoding", "it is not UTF-8", line) from error
    lines = text.split("\n")
    comments = next(place for place, line in enumerate(lines) if not line.startswith("#"))
    try:
        content = json_of(lines[comments:-1], comments + 1)
    except LayoutError as error:
        what = f"not the layout of a {kind.key}: {error.what}"
        raise kind.refused(name, "layout", what, error.line) from error
    try:
        record = model.model_validate_json(content)
    except ValidationError as error:
        raise LockError(_faults(error, name, comments, kind)) from error
    again = record_text(record)
    if again != text:
        written = enumerate(zip(again.split("\n"), lines, strict=False), 1)
        line = next((number for number, (should, is_) in written if should != is_), 1)
        raise kind.refused(name, "layout", f"not the layout in which a {kind.key} is written", line)
    return record


def _check_version(data: bytes, name: str, kind: FileKind) -> None:
    """Refuse what is no such file, or one of another version of its language."""
    pattern = rb"(?:#[^\n]*\n)*" + kind.key.encode() + rb": (\d{1,9})\n"
    found = re.match(pattern, data.replace(b"\r\n", b"\n") if b"\r\n" in data[:1000] else data)
    if found is None:
        if _MERGE_MARK.search(data[:1000]):
            raise _merge(name, kind)
        what = f"it is no {kind.file}: it does not begin with '{kind.key}: {kind.version}'"
        raise kind.refused(name, f"no_{kind.key}", what)
    version = int(found.group(1))
    if version != kind.version:
        newer = "a newer program wrote it" if version > kind.version else "there is no such version"
        what = f"it is of version {version} of the {kind.key}, this program reads {kind.version}: {newer}"
        raise kind.refused(name, "version", what)


def _check_digest(data: bytes, name: str, kind: FileKind) -> None:
    """Refuse a file that is not whole, or of which a covered byte is not as written."""
    if b"\r\n" in data:
        # Version control may do this on its own; the digest would only say that something changed.
        what = "its line ends were changed to CRLF; store it as it was written, with LF"
        raise kind.refused(name, "line_ends", what)
    if _MERGE_MARK.search(data):
        raise _merge(name, kind)
    stated = _DIGEST_LINE.search(data)
    if stated is None:
        raise kind.refused(name, "cut_short", "it is cut short: its last line should be its digest")
    end = data.find(_COVERED_ENDS)
    if end < 0 or digest_of(data[: end + 1]) != stated.group(1).decode():
        what = "it was changed after it was written: its digest does not fit"
        raise kind.refused(name, "digest", what)


def _merge(name: str, kind: FileKind) -> LockError:
    """What is said of a file that version control left half merged."""
    return kind.refused(name, "merge", f"it holds an unfinished merge; take one side or {kind.again}")


def _faults(error: ValidationError, name: str, lines_before: int, kind: FileKind) -> list[Fault]:
    """Turn what the models found into faults, each with its place or its line."""
    found = error.errors(include_url=False, include_input=False, include_context=False)
    if found[0]["type"] == "json_invalid":
        at = _JSON_LINE.search(found[0]["msg"])
        line = None if at is None else int(at.group(1)) + lines_before
        what = f"not the layout of a {kind.key}: a value on it cannot be read"
        return [Fault(file=name, line=line, place="", what=what, code=f"{kind.key}.layout")]
    faults = [
        Fault(
            file=name, line=None, place=_place(one["loc"]), what=one["msg"], code=f"{kind.key}.{one['type']}"
        )
        for one in found[:_TOLD]
    ]
    if len(found) > _TOLD:
        more = f"and {len(found) - _TOLD} more of the kind"
        faults.append(Fault(file=name, line=None, place="", what=more, code=f"{kind.key}.more"))
    return faults


def _place(steps: tuple[int | str, ...]) -> str:
    """Write the place of a field as a path."""
    path = "".join(f"[{step}]" if isinstance(step, int) else f".{step}" for step in steps)
    return path.removeprefix(".")
