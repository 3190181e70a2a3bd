"""From a checked bundle to a folder: whole or not at all, and over nothing that is there."""

from __future__ import annotations

import contextlib
import os
import shutil
import tempfile
import zipfile
from collections.abc import Iterator, Sequence
from pathlib import Path

from beforehand.faults import Fault, InputError, WriteError
from beforehand.handing.opening import contents


def require_free(folder: Path, names: Sequence[str]) -> None:
    """Make sure that nothing stands where the files of a bundle will.

    Raises
    ------
    InputError
        With every file that is there already.
    WriteError
        The folder cannot be one.
    """
    if folder.is_symlink() and not folder.exists():
        raise WriteError(f"{folder}: cannot be written: it is a link to nothing")
    if folder.exists() and not folder.is_dir():
        raise WriteError(f"{folder}: cannot be written: it is a file, not a folder")
    if not folder.parent.is_dir():
        raise WriteError(f"{folder}: cannot be written: its folder does not exist")
    faults = [
        Fault(file=str(folder / name), line=None, place="", what=what, code="receive.exists")
        for name in names
        if (what := _stands_in_the_way(folder, name)) is not None
    ]
    if faults:
        raise InputError(faults)


def _stands_in_the_way(folder: Path, name: str) -> str | None:
    """Why a file cannot be put under a name; None where it can."""
    way = folder
    for part in name.split("/")[:-1]:
        way = way / part
        if way.is_symlink():
            return "would be written through a link"
        if way.exists() and not way.is_dir():
            return f"cannot be written: {way} is a file"
    if os.path.lexists(folder / name):
        return "is there already and is left as it is; name another folder"
    return None


@contextlib.contextmanager
def beside_folder(folder: Path) -> Iterator[Path]:
    """A temporary folder on the disk of another one, gone at the end whatever happens."""
    try:
        made = Path(tempfile.mkdtemp(prefix=".beforehand-", suffix=".part", dir=folder.resolve().parent))
    except OSError as error:
        raise WriteError(f"{folder}: cannot be written: {_reason(error)}") from error
    try:
        yield made
    finally:
        shutil.rmtree(made, ignore_errors=True)


def unpack(bundle: zipfile.ZipFile, names: Sequence[str], into: Path) -> None:
    """Unpack members of a bundle that has been checked.

    Raises
    ------
    WriteError
        The disk does not take them.
    """
    try:
        for name in names:
            target = into / name
            target.parent.mkdir(parents=True, exist_ok=True)
            with target.open("xb") as file:
                for piece in contents(bundle, name):
                    file.write(piece)
    except OSError as error:
        raise WriteError(f"{into.name}: cannot be unpacked: {_reason(error)}") from error


def place(source: Path, folder: Path, names: Sequence[str]) -> None:
    """Move unpacked files to where they belong; on a failure all that was moved is taken back.

    Raises
    ------
    WriteError
        A file came in the way meanwhile, or the disk does not take them.
    """
    try:
        if not folder.exists():
            source.chmod(0o777 & ~_mask())
            source.rename(folder)
            return
        _one_by_one(source, folder, names)
    except OSError as error:
        raise WriteError(f"{folder}: cannot be written: {_reason(error)}") from error


def _one_by_one(source: Path, folder: Path, names: Sequence[str]) -> None:
    """Move files into a folder that is there already."""
    made: list[Path] = []
    try:
        for name in names:
            target = folder / name
            for above in reversed(list(target.relative_to(folder).parents)[:-1]):
                if not (folder / above).exists():
                    (folder / above).mkdir()
                    made.append(folder / above)
            # Unlike a renaming, making a second name never replaces what came to be there.
            _second_name(source / name, target)
            made.append(target)
    except BaseException:
        for path in reversed(made):
            with contextlib.suppress(OSError):
                path.rmdir() if path.is_dir() else path.unlink()
        raise


def _second_name(source: Path, target: Path) -> None:
    """Give a file its name in the folder; a copy where the disk knows no second names."""
    try:
        target.hardlink_to(source)
    except FileExistsError:
        raise
    except OSError:
        with source.open("rb") as old, target.open("xb") as new:
            try:
                shutil.copyfileobj(old, new)
            except BaseException:
                with contextlib.suppress(OSError):
                    target.unlink()
                raise


def _mask() -> int:
    """The permission bits that new files do not get."""
    mask = os.umask(0)
    os.umask(mask)
    return mask


def _reason(error: OSError) -> str:
    return (error.strerror or "the system refuses").lower()
