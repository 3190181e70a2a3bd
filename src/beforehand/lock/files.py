"""Writing files whole or not at all.

The new content goes into a file of its own beside the target, reaches the disk, and then takes the
target's name in one step. Whatever interrupts it, the target holds the old content or the new.
"""

from __future__ import annotations

import contextlib
import errno
import os
import stat
import tempfile
from pathlib import Path

from beforehand.faults import WriteError

_REASONS = {
    errno.ENOSPC: "no space is left on the disk",
    errno.EDQUOT: "the disk quota is used up",
    errno.EFBIG: "the file would be larger than the file system allows",
    errno.EROFS: "the file system is read-only",
    errno.EACCES: "its folder does not permit writing",
    errno.EPERM: "its folder does not permit writing",
    errno.ENOENT: "its folder does not exist",
    errno.ENOTDIR: "a part of its path is not a folder",
    errno.EISDIR: "it is a folder",
    errno.ENAMETOOLONG: "its name is too long",
    errno.ELOOP: "its symbolic links lead in a circle",
    errno.EIO: "the disk reports an error",
}

# Permission bits of a new file before the process's own mask, as for any file a program makes.
_NEW_FILE = 0o666


def write_whole(path: str | os.PathLike[str], content: bytes) -> None:
    """Write a file whole or not at all.

    Parameters
    ----------
    path : path
        The file; a symbolic link is followed and stays one. What stands there is replaced, and its
        permission bits are kept.
    content : bytes
        All of its content.

    Raises
    ------
    WriteError
        The file cannot be written; what stood there is untouched and nothing is left beside it.
    """
    try:
        target = Path(os.path.realpath(path, strict=False))
        if target.is_dir():
            raise IsADirectoryError(errno.EISDIR, os.strerror(errno.EISDIR))
        if target.exists() and not target.is_file():
            # A device or a pipe has no content to put a file in the place of.
            raise OSError(errno.EINVAL, "it is not a regular file")
        _replace(target, content)
    except OSError as error:
        raise WriteError(f"{os.fspath(path)}: cannot be written: {_reason(error)}") from error
    except ValueError as error:
        raise WriteError(f"{os.fspath(path)!r}: cannot be written: no file can have this name") from error


def _replace(target: Path, content: bytes) -> None:
    """Put ``content`` in place of ``target`` by way of a temporary file in the same folder."""
    # The temporary name does not grow with the target's, which may be as long as names can be.
    handle, name = tempfile.mkstemp(prefix=".beforehand-", suffix=".part", dir=target.parent)
    try:
        try:
            os.chmod(name, _permissions(target))
            _write_all(handle, content)
            os.fsync(handle)
        finally:
            os.close(handle)
        os.replace(name, target)
    except BaseException:
        # Also on an interrupt from the keyboard: half a file must not stay, in any name.
        with contextlib.suppress(OSError):
            os.unlink(name)
        raise
    _sync_folder(target.parent)


def _write_all(handle: int, content: bytes) -> None:
    """Write every byte; one call may take fewer than it was given."""
    rest = memoryview(content)
    while rest:
        rest = rest[os.write(handle, rest) :]


def _permissions(target: Path) -> int:
    """Permission bits of the file that is replaced, or those of a new one."""
    try:
        return stat.S_IMODE(target.stat().st_mode)
    except FileNotFoundError:
        mask = os.umask(0)
        os.umask(mask)
        return _NEW_FILE & ~mask


def _sync_folder(folder: Path) -> None:
    """Let the new name reach the disk; not every system can, and the file is whole without it."""
    with contextlib.suppress(OSError):
        handle = os.open(folder, os.O_RDONLY)
        try:
            os.fsync(handle)
        finally:
            os.close(handle)


def _reason(error: OSError) -> str:
    """Why, in plain words."""
    return _REASONS.get(error.errno or 0) or (error.strerror or "the system refuses").lower()
