"""Read a plan's table: from its file, or from a DataFrame in memory."""

from __future__ import annotations

import os
from collections.abc import Mapping
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from beforehand.faults import DataError, Fault, did_you_mean
from beforehand.plan import Plan
from beforehand.table.cells import content_of, fault, read_cells, text_of
from beforehand.table.columns import Table
from beforehand.table.conversion import numbers_of, texts_of
from beforehand.table.fast import SMALLEST, quick_columns
from beforehand.table.preparing import AsRead, prepared, row_namer
from beforehand.table.wanted import Wanted, wanted_of

if TYPE_CHECKING:
    import pandas as pd

IN_MEMORY = "table"


def read_table(
    plan: Plan,
    path: str | os.PathLike[str] | None = None,
    *,
    columns: Mapping[str, str] | None = None,
) -> Table:
    """Read the table of a plan under its contract.

    Parameters
    ----------
    plan : Plan
    path : path, optional
        A file anywhere, instead of the one that the plan names inside its own folder.
    columns : mapping of str to str, optional
        Names of the file's columns by those of the plan, where they differ; faults name the file's own.

    Returns
    -------
    Table

    Raises
    ------
    DataError
        With every fault of the table.
    """
    if columns:
        return _under_other_names(plan, path, columns)
    file, name = _located(plan, path)
    content = content_of(file, name)
    wanted = wanted_of(plan)
    if len(content) >= SMALLEST:
        plain = file if file.stat().st_size == len(content) else None
        quick = quick_columns(content, plan.data, wanted, plain)
        if quick is not None:
            del content
            rows = len(next(iter(quick.values())))
            try:
                return prepared(plan, AsRead(file=name, columns=quick, n_rows=rows))
            except DataError:
                # The strict way names the lines of what is wrong.
                del quick
                content = content_of(file, name)
    cells = read_cells(text_of(content, plan.data, name), plan.data, wanted, name)
    return _typed(plan, cells.columns, cells.lines, wanted, name)


def _under_other_names(plan: Plan, path: str | os.PathLike[str] | None, columns: Mapping[str, str]) -> Table:
    """The table of a file whose columns have names of their own; the strict way, whatever its size."""
    file, name = _located(plan, path)
    own = {column: columns.get(column, column) for column in wanted_of(plan)}
    renamed: dict[str, Wanted] = {}
    for column, want in wanted_of(plan).items():
        if own[column] in renamed:
            what = f"is read twice: as {renamed[own[column]].name!r} and as {column!r}"
            raise DataError([fault(name, 1, own[column], what, "repeated_column")])
        renamed[own[column]] = want
    cells = read_cells(text_of(content_of(file, name), plan.data, name), plan.data, renamed, name)
    found = {column: cells.columns[own[column]] for column in own}
    try:
        return _typed(plan, found, cells.lines, wanted_of(plan), name)
    except DataError as error:
        faults = [replace(one, place=own.get(one.place, one.place)) for one in error.faults]
        raise DataError(faults) from None


def _located(plan: Plan, path: str | os.PathLike[str] | None) -> tuple[Path, str]:
    """The file to read and the name by which faults call it."""
    if path is not None:
        return Path(path), str(path)
    if plan.origin is None or plan.origin.path is None:
        what = "the plan was not read from a file, so its table must be given"
        raise DataError([fault(plan.data.file, None, "data.file", what, "no_file")])
    folder = Path(plan.origin.path).parent
    file = folder / plan.data.file
    # A link may lead out of the folder although the name does not.
    if not file.resolve().is_relative_to(folder.resolve()):
        what = "leads out of the plan's folder"
        raise DataError([fault(str(plan.origin.path), None, "data.file", what, "outside_folder")])
    return file, str(file)


def _typed(
    plan: Plan,
    columns: Mapping[str, list[str]],
    lines: list[int],
    wanted: Mapping[str, Wanted],
    name: str,
) -> Table:
    """Cells under the kinds that the plan declares; all faults of all columns at once."""
    typed: dict[str, NDArray[Any]] = {}
    for column, want in wanted.items():
        if want.kind == "text":
            typed[column] = texts_of(columns[column], plan.data)
    namer = row_namer(AsRead(file=name, columns=typed, n_rows=len(lines), lines=lines), plan.data.row_label)
    faults: list[Fault] = []
    for column, want in wanted.items():
        if want.kind == "number":
            values, found = numbers_of(columns[column], plan.data, name, column, namer, lines)
            typed[column] = values
            faults.extend(found)
    read = AsRead(
        file=name, columns={column: typed[column] for column in wanted}, n_rows=len(lines), lines=lines
    )
    if not faults:
        return prepared(plan, read)
    # A wrong number does not hide what is wrong with labels, levels and ranges.
    try:
        prepared(plan, read)
    except DataError as error:
        faults.extend(error.faults)
    raise DataError(sorted(faults, key=lambda one: (one.line is None, one.line or 0)))


def table_from_frame(plan: Plan, frame: pd.DataFrame) -> Table:
    """The table of a plan from a DataFrame; its index is not used.

    Numeric columns are taken as they are. Everything else goes through text, under the same
    contract as a file.

    Raises
    ------
    DataError
        With every fault of the table.
    """
    wanted = wanted_of(plan)
    faults: list[Fault] = []
    names = [str(name) for name in frame.columns]
    for column in wanted:
        if column not in names:
            what = "the table has no such column" + did_you_mean(column, names)
            faults.append(fault(IN_MEMORY, None, column, what, "no_column"))
        elif names.count(column) > 1:
            faults.append(fault(IN_MEMORY, None, column, "the column stands twice", "repeated_column"))
    if faults:
        raise DataError(faults)
    if not len(frame):
        raise DataError([fault(IN_MEMORY, None, "", "has no rows", "no_rows")])
    typed: dict[str, NDArray[Any]] = {}
    for column, want in wanted.items():
        series = frame.iloc[:, names.index(column)]
        if want.kind == "text":
            typed[column] = texts_of(frame_cells(series, plan), plan.data)
    namer = row_namer(AsRead(file=IN_MEMORY, columns=typed, n_rows=len(frame)), plan.data.row_label)
    for column, want in wanted.items():
        if want.kind == "number":
            series = frame.iloc[:, names.index(column)]
            typed[column], found = frame_numbers(series, plan, column, namer)
            faults.extend(found)
    if faults:
        raise DataError(faults)
    columns = {column: typed[column] for column in wanted}
    return prepared(plan, AsRead(file=IN_MEMORY, columns=columns, n_rows=len(frame)))


def frame_numbers(
    series: Any, plan: Plan, column: str, namer: Any
) -> tuple[NDArray[np.float64], list[Fault]]:
    """A column of a frame as numbers."""
    from pandas.api.types import is_bool_dtype, is_numeric_dtype

    if not (is_numeric_dtype(series.dtype) or is_bool_dtype(series.dtype)) or series.dtype.kind == "c":
        return numbers_of(frame_cells(series, plan), plan.data, IN_MEMORY, column, namer, ())
    values = series.to_numpy(dtype=np.float64, na_value=np.nan)
    infinite = np.flatnonzero(np.isinf(values))
    if len(infinite):
        where = ", ".join(namer(int(row)) for row in infinite[:5])
        more = "" if len(infinite) <= 5 else f" and {len(infinite) - 5:,} more"
        plural = "row" if len(infinite) == 1 else "rows"
        what = f"a value is infinite ({plural} {where}{more})"
        return values, [fault(IN_MEMORY, None, column, what, "not_a_number")]
    if np.signbit(values[values == 0.0]).any():
        values = values + 0.0
    return values, []


def frame_cells(series: Any, plan: Plan) -> list[str]:
    """A column of a frame as the cells of a file."""
    missing = plan.data.missing_codes[0] if plan.data.missing_codes else ""
    return [missing if _absent(value) else _cell(value) for value in series.tolist()]


def _absent(value: Any) -> bool:
    """Whether a value of a frame stands for nothing."""
    return value is None or type(value).__name__ in ("NAType", "NaTType") or value != value


def _cell(value: Any) -> str:
    """A value of a frame as it would stand in a file: whole numbers without a point, days without hours."""
    if isinstance(value, bool):
        return str(value)
    if isinstance(value, float) and value.is_integer():
        return str(int(value))
    if hasattr(value, "isoformat"):
        text = str(value.isoformat())
        return text.removesuffix("T00:00:00")
    return str(value)
