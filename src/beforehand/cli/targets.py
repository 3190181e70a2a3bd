"""Files that are about to be written: what must hold before the work begins."""

from __future__ import annotations

from pathlib import Path

from beforehand.faults import WriteError


def require_folder(path: Path) -> None:
    """Make sure that the folder of a file is there, before anything is computed for it.

    Raises
    ------
    WriteError
        There is no such folder.
    """
    if not path.parent.is_dir():
        raise WriteError(f"{path}: cannot be written: its folder does not exist")


def refuse_to_replace(path: Path, sign: str, what: str) -> None:
    """Protect what a person may have written: only a file of our own making is replaced.

    Parameters
    ----------
    path : Path
        A file that is about to be written; nothing happens where there is none.
    sign : str
        Text that stands near the start of every file of this kind that the program has written.
    what : str
        Name of the kind of file, for the message.

    Raises
    ------
    WriteError
        Another kind of file has this name.
    """
    try:
        with path.open("rb") as file:
            start = file.read(4096)
    except OSError:
        # No file, or none that can be read: writing itself will say what is wrong.
        return
    if start and sign.encode("utf-8") not in start:
        raise WriteError(f"{path}: is not {what} and is left as it is; name another file")
