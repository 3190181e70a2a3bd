"""New cases under a plan's contract: the columns that a prediction needs, in the order of the file."""

from __future__ import annotations

import os
from collections.abc import Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Any

from numpy.typing import NDArray

from beforehand.faults import DataError, Fault, did_you_mean
from beforehand.plan import Plan
from beforehand.table.cells import content_of, fault, read_cells, text_of
from beforehand.table.conversion import numbers_of, texts_of
from beforehand.table.preparing import AsRead, label_faults, row_namer
from beforehand.table.reading import IN_MEMORY, frame_cells, frame_numbers
from beforehand.table.wanted import Wanted

if TYPE_CHECKING:
    import pandas as pd


def read_fresh(
    plan: Plan,
    wanted: Mapping[str, Wanted],
    path: str | os.PathLike[str],
    *,
    columns: Mapping[str, str] | None = None,
) -> AsRead:
    """Read some columns of a file that need not hold all that the plan's own table holds.

    Parameters
    ----------
    plan : Plan
        Whose separator, decimal mark, encoding, missing codes and row labels count.
    wanted : mapping of str to Wanted
        Columns by the plan's names.
    path : path
    columns : mapping of str to str, optional
        Names of the file's columns by those of the plan, where they differ.

    Returns
    -------
    AsRead
        Under the plan's names; rows in the order of the file.

    Raises
    ------
    DataError
        With every fault of the file.
    """
    name = os.fspath(path)
    own = {column: (columns or {}).get(column, column) for column in wanted}
    cells = read_cells(text_of(content_of(Path(path), name), plan.data, name), plan.data, _needed(own), name)
    typed: dict[str, NDArray[Any]] = {}
    for column, want in wanted.items():
        if want.kind == "text":
            typed[column] = texts_of(cells.columns[own[column]], plan.data)
    rows, faults = len(cells.lines), list[Fault]()
    namer = row_namer(AsRead(file=name, columns=typed, n_rows=rows, lines=cells.lines), plan.data.row_label)
    for column, want in wanted.items():
        if want.kind == "number":
            typed[column], found = numbers_of(
                cells.columns[own[column]], plan.data, name, own[column], namer, cells.lines
            )
            faults.extend(found)
    return _whole(plan, AsRead(file=name, columns=typed, n_rows=rows, lines=cells.lines), faults)


def fresh_from_frame(plan: Plan, wanted: Mapping[str, Wanted], frame: pd.DataFrame) -> AsRead:
    """The same columns of a DataFrame; its index is not used.

    Raises
    ------
    DataError
        With every fault of the table.
    """
    names = [str(name) for name in frame.columns]
    faults: list[Fault] = []
    for column in wanted:
        if column not in names:
            what = "the table has no such column" + did_you_mean(column, names)
            faults.append(fault(IN_MEMORY, None, column, what, "no_column"))
        elif names.count(column) > 1:
            faults.append(fault(IN_MEMORY, None, column, "the column stands twice", "repeated_column"))
    if not len(frame):
        faults.append(fault(IN_MEMORY, None, "", "has no rows", "no_rows"))
    if faults:
        raise DataError(faults)
    series = {column: frame.iloc[:, names.index(column)] for column in wanted}
    typed: dict[str, NDArray[Any]] = {}
    for column, want in wanted.items():
        if want.kind == "text":
            typed[column] = texts_of(frame_cells(series[column], plan), plan.data)
    namer = row_namer(AsRead(file=IN_MEMORY, columns=typed, n_rows=len(frame)), plan.data.row_label)
    for column, want in wanted.items():
        if want.kind == "number":
            typed[column], found = frame_numbers(series[column], plan, column, namer)
            faults.extend(found)
    return _whole(plan, AsRead(file=IN_MEMORY, columns=typed, n_rows=len(frame)), faults)


def _needed(own: Mapping[str, str]) -> list[str]:
    """The file's names of the columns, each once."""
    return list(dict.fromkeys(own.values()))


def _whole(plan: Plan, read: AsRead, faults: list[Fault]) -> AsRead:
    """What was read, unless a cell or a label is wrong."""
    if plan.data.row_label is not None:
        faults.extend(label_faults(plan, read, row_namer(read, plan.data.row_label)))
    if faults:
        raise DataError(sorted(faults, key=lambda one: (one.line is None, one.line or 0)))
    return read
