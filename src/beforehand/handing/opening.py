"""A bundle from outside: looked through to its last byte before anything of it is written."""

from __future__ import annotations

import contextlib
import hashlib
import stat
import zipfile
import zlib
from collections.abc import Iterator, Sequence
from pathlib import Path
from typing import BinaryIO

from beforehand.faults import Fault, InputError
from beforehand.handing import limits
from beforehand.handing.manifest import MANIFEST, Manifest, Member, read_manifest

_PIECE = 1 << 20

# The record at the end of a zip file, and the one before it in the format for very large ones.
_END, _END_SIZE = b"PK\x05\x06", 22
_LARGE_END, _LARGE_END_SIZE = b"PK\x06\x07", 20

# An entry of the directory takes its name and some sixty bytes more.
_LARGEST_DIRECTORY = limits.MOST_MEMBERS * 1024

_ENCRYPTED = 0x1 | 0x40 | 0x2000
_KINDS = (zipfile.ZIP_STORED, zipfile.ZIP_DEFLATED)

_DAMAGED = (zipfile.BadZipFile, zlib.error, EOFError, NotImplementedError, RuntimeError, ValueError, OSError)


@contextlib.contextmanager
def opened(path: Path) -> Iterator[tuple[zipfile.ZipFile, Manifest]]:
    """A bundle, once all of it has been checked: limits, names, kinds, and every digest.

    Raises
    ------
    InputError
        With every fault.
    """
    name = str(path)
    try:
        file = path.open("rb")
    except FileNotFoundError:
        raise _refused(name, "there is no such file", "no_file") from None
    except IsADirectoryError:
        raise _refused(name, "is a folder, not a bundle", "no_file") from None
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or str(error)
        raise _refused(name, f"cannot be read: {reason.lower()}", "unreadable") from None
    with file:
        _look_at_the_ends(file, name)
        try:
            bundle = zipfile.ZipFile(file)
        except _DAMAGED:
            raise _refused(name, "is damaged: its directory cannot be read", "damaged") from None
        with bundle:
            infos = bundle.infolist()
            _raise(list(_member_faults(infos, name)))
            manifest = _manifest(bundle, name)
            _raise(list(_listing_faults(infos, manifest, name)))
            _raise(list(_content_faults(bundle, infos, manifest, name)))
            yield bundle, manifest


def contents(bundle: zipfile.ZipFile, member: str) -> Iterator[bytes]:
    """A member's content in pieces."""
    with bundle.open(member) as opened_member:
        while piece := opened_member.read(_PIECE):
            yield piece


def _refused(file: str, what: str, code: str, place: str = "") -> InputError:
    return InputError([Fault(file=file, line=None, place=place, what=what, code=f"bundle.{code}")])


def _raise(faults: Sequence[Fault]) -> None:
    if faults:
        raise InputError(faults)


def _look_at_the_ends(file: BinaryIO, name: str) -> None:
    """Refuse what is no bundle before anything in it is believed, its directory's size least of all."""
    start = file.read(4)
    size = file.seek(0, 2)
    if not start.startswith(b"PK"):
        raise _refused(name, "is not a bundle", "no_bundle")
    file.seek(max(0, size - _END_SIZE - _LARGE_END_SIZE))
    tail = file.read()
    end = tail[-_END_SIZE:]
    if len(end) < _END_SIZE or not end.startswith(_END) or end[20:22] != b"\x00\x00":
        raise _refused(name, "is cut short, or no bundle: it does not end as one", "cut_short")
    directory = int.from_bytes(end[12:16], "little")
    if tail.startswith(_LARGE_END) or directory > _LARGEST_DIRECTORY:
        what = f"has more members than the {limits.MOST_MEMBERS} that a bundle may have"
        raise _refused(name, what, "members")
    if size > limits.LARGEST_TOTAL:
        raise _refused(name, f"has {size:,} bytes; a bundle has at most {limits.LARGEST_TOTAL:,}", "size")
    file.seek(0)


def _member_faults(infos: Sequence[zipfile.ZipInfo], bundle: str) -> Iterator[Fault]:
    """What is wrong with the directory: numbers, sizes, names, kinds."""

    def fault(place: str, what: str, code: str) -> Fault:
        return Fault(file=bundle, line=None, place=place, what=what, code=f"bundle.{code}")

    if len(infos) > limits.MOST_MEMBERS:
        what = f"has {len(infos)} members; a bundle has at most {limits.MOST_MEMBERS}"
        yield fault("", what, "members")
        return
    # The name as it stands in the file: the library cuts one at a NUL, and turns separators.
    yield from limits.name_faults([info.orig_filename for info in infos], bundle)
    for info in infos:
        name = info.orig_filename
        kind = stat.S_IFMT(info.external_attr >> 16)
        if kind not in (0, stat.S_IFREG):
            what = "is a link" if kind == stat.S_IFLNK else "is not a regular file"
            yield fault(name, what, "kind")
        if info.flag_bits & _ENCRYPTED:
            yield fault(name, "is encrypted", "encrypted")
        elif info.compress_type not in _KINDS:
            yield fault(name, "is packed in a way that bundles are not", "packing")
        if info.file_size > limits.LARGEST_MEMBER:
            what = f"unpacks to {info.file_size:,} bytes; a member has at most {limits.LARGEST_MEMBER:,}"
            yield fault(name, what, "size")
        elif info.file_size > limits.HIGHEST_RATIO * max(1, info.compress_size):
            ratio = info.file_size // max(1, info.compress_size)
            what = f"unpacks to {ratio:,} times its size; at most {limits.HIGHEST_RATIO} times is let in"
            yield fault(name, what, "ratio")
    total = sum(info.file_size for info in infos)
    if total > limits.LARGEST_TOTAL:
        what = f"unpacks to {total:,} bytes; a bundle has at most {limits.LARGEST_TOTAL:,}"
        yield fault("", what, "size")


def _manifest(bundle: zipfile.ZipFile, name: str) -> Manifest:
    """The manifest, which is the first thing that is unpacked."""
    try:
        info = bundle.getinfo(MANIFEST)
    except KeyError:
        raise _refused(name, f"holds no {MANIFEST}: it is not a bundle", "no_manifest") from None
    if info.file_size > limits.LARGEST_MANIFEST:
        what = f"has {info.file_size:,} bytes; a manifest has at most {limits.LARGEST_MANIFEST:,}"
        raise _refused(name, what, "size", MANIFEST)
    try:
        content = b"".join(contents(bundle, MANIFEST))
    except _DAMAGED:
        raise _refused(name, "is damaged and cannot be unpacked", "damaged", MANIFEST) from None
    return read_manifest(content, name)


def _listing_faults(infos: Sequence[zipfile.ZipInfo], manifest: Manifest, bundle: str) -> Iterator[Fault]:
    """Members that the manifest does not list, and the other way about."""
    held = {info.orig_filename for info in infos} - {MANIFEST}
    for name in sorted(held - set(manifest.members)):
        what = f"is not in {MANIFEST}"
        yield Fault(file=bundle, line=None, place=name, what=what, code="bundle.unlisted")
    for name in sorted(set(manifest.members) - held):
        what = f"is in {MANIFEST} and not in the bundle"
        yield Fault(file=bundle, line=None, place=name, what=what, code="bundle.missing")


def _content_faults(
    bundle: zipfile.ZipFile, infos: Sequence[zipfile.ZipInfo], manifest: Manifest, name: str
) -> Iterator[Fault]:
    """Members that cannot be unpacked, or whose content is not what the manifest says."""
    for info in infos:
        if info.filename == MANIFEST:
            continue
        what = _wrong_content(bundle, info, manifest.members[info.filename])
        if what is not None:
            yield Fault(file=name, line=None, place=info.filename, what=what, code="bundle.content")


def _wrong_content(bundle: zipfile.ZipFile, info: zipfile.ZipInfo, member: Member) -> str | None:
    """What is wrong with one member's content; None where it is as listed."""
    if info.file_size != member.size:
        return f"has {info.file_size:,} bytes; {MANIFEST} says {member.size:,}"
    digest, size = hashlib.sha256(), 0
    try:
        for piece in contents(bundle, info.filename):
            digest.update(piece)
            size += len(piece)
    except _DAMAGED:
        return "is damaged and cannot be unpacked"
    if size != member.size or digest.hexdigest() != member.sha256:
        return f"was changed: its SHA-256 is not the one in {MANIFEST}"
    return None
