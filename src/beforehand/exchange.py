"""Handing a plan and its record to someone else, and receiving them."""

from __future__ import annotations

import os
from collections.abc import Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Literal

from beforehand.running import Progress

if TYPE_CHECKING:
    from beforehand.handing import Handover, Received


def handover(
    plan: str | os.PathLike[str],
    output: str | os.PathLike[str],
    *,
    data: str | os.PathLike[str] | None = None,
    with_data: bool = False,
    labels: Literal["shown", "hashed"] = "hashed",
    share_safe: bool = False,
) -> Handover:
    """Pack a plan and all that stands beside it into one file that a recipient can check.

    Parameters
    ----------
    plan, output : path
        The plan, and the bundle; only an earlier bundle is replaced.
    data : path, optional
        The table, if it is not the one that the plan names.
    with_data : bool
        Whether the columns that the plan names go along.
    labels : {"hashed", "shown"}
        How row labels stand in the table that goes along.
    share_safe : bool
        Whether the lock goes along only as a copy that gives no row away.

    Raises
    ------
    InputError, PlanError, DataError, LockError, WriteError
    """
    from beforehand.handing import hand_over

    table = None if data is None else Path(data)
    return hand_over(
        Path(plan), Path(output), data=table, with_data=with_data, labels=labels, share_safe=share_safe
    )


def receive(
    bundle: str | os.PathLike[str],
    folder: str | os.PathLike[str],
    *,
    data: str | os.PathLike[str] | None = None,
    columns: Mapping[str, str] | str | os.PathLike[str] | None = None,
    progress: Progress | None = None,
) -> Received:
    """Check a bundle, unpack it into a folder, and compute its lock again where there is a table.

    Parameters
    ----------
    bundle, folder : path
        Nothing in the folder is overwritten; a bundle with a fault leaves nothing in it.
    data : path, optional
        The recipient's table, instead of one in the bundle.
    columns : mapping of str to str, or path, optional
        Names of that table's columns by those of the plan, or a YAML file of them.
    progress : callable, optional
        Hears what is being done.

    Raises
    ------
    InputError, PlanError, DataError, LockError, WriteError
    """
    from beforehand.handing import receive_bundle

    table = None if data is None else Path(data)
    return receive_bundle(Path(bundle), Path(folder), data=table, columns=columns, progress=progress)
