"""The table that goes along in a bundle: only the columns that the plan names, rows in canonical order."""

from __future__ import annotations

import csv
import io
import os
from collections.abc import Callable, Mapping, Sequence
from dataclasses import replace
from pathlib import Path

import numpy as np

from beforehand.faults import DataError, Fault, InputError, did_you_mean
from beforehand.plan import Plan, with_changes
from beforehand.plan.yaml_nodes import NULLS, read_yaml
from beforehand.table import Table, read_table
from beforehand.table.cells import Cells, content_of, read_cells, text_of
from beforehand.table.conversion import numbers_of, texts_of
from beforehand.table.preparing import AsRead, canonical_order
from beforehand.table.wanted import Wanted, wanted_of

Read = Callable[[Plan], Table]

# Of these encodings the order of bytes is the machine's own unless it is named.
_BYTE_ORDER = {"utf-16": "utf-16-le", "utf-32": "utf-32-le"}


def plans_read(plan: Plan, first: Plan | None) -> tuple[Plan, ...]:
    """Every plan whose run reads the table: the plan, its alternatives, and the plan as first sealed."""
    changed = tuple(with_changes(plan, changes) for changes in plan.alternatives.values())
    return (plan, *changed) if first is None else (plan, *changed, first)


def columns_read(plans: Sequence[Plan]) -> dict[str, Wanted]:
    """Columns that any of the plans reads, by name; the first plan's kinds go before the others'."""
    found: dict[str, Wanted] = {}
    for plan in plans:
        found |= {name: want for name, want in wanted_of(plan).items() if name not in found}
    return found


def table_bytes(
    plan: Plan, plans: Sequence[Plan], path: Path | None, labels: Callable[[str], str] | None
) -> bytes:
    """A table as a file under the plan's own contract: its separator, decimal mark, codes and encoding.

    Cells are as they stand in the table's file, so that no number loses a digit. The label comes
    first; rows stand in an order that does not depend on the file's.

    Parameters
    ----------
    plan : Plan
    plans : sequence of Plan
        All that read the table.
    path : Path or None
        The file, if it is not the one that the plan names.
    labels : callable or None
        What stands for a row's label; None where it is shown.

    Raises
    ------
    DataError
        The file does not keep the plan's contract.
    """
    file, name = located(plan, path)
    wanted = columns_read(plans)
    label = plan.data.row_label
    if label is not None:
        wanted = {label: wanted[label]} | wanted
    cells = read_cells(text_of(content_of(file, name), plan.data, name), plan.data, wanted, name)
    columns = {column: [cell.strip() for cell in cells.columns[column]] for column in wanted}
    if label is not None and labels is not None:
        columns[label] = [labels(cell) for cell in columns[label]]
    made = io.StringIO(newline="")
    writer = csv.writer(made, delimiter=plan.data.separator, lineterminator="\n")
    writer.writerow(columns)
    lines = list(zip(*columns.values(), strict=True))
    writer.writerows(lines[row] for row in _order(plan, cells))
    encoding = plan.data.encoding.lower()
    fixed = _BYTE_ORDER.get(encoding)
    text = made.getvalue()
    return text.encode(encoding) if fixed is None else f"\ufeff{text}".encode(fixed)


def _order(plan: Plan, cells: Cells) -> list[int]:
    """Places of the rows in canonical order."""
    typed = {
        column: texts_of(cells.columns[column], plan.data)
        if want.kind == "text"
        else numbers_of(cells.columns[column], plan.data, "", column, str, ())[0]
        for column, want in wanted_of(plan).items()
    }
    order: list[int] = canonical_order(plan, AsRead(file="", columns=typed, n_rows=len(cells.lines))).tolist()
    return order


def located(plan: Plan, path: Path | None) -> tuple[Path, str]:
    """The table's file, and how faults name it."""
    if path is not None:
        return path, str(path)
    folder = Path("." if plan.origin is None or plan.origin.path is None else plan.origin.path).parent
    return folder / plan.data.file, str(folder / plan.data.file)


def label_uses(plans: Sequence[Plan]) -> tuple[str, ...]:
    """Places in which a plan uses the row label as more than a label; a hash cannot serve there."""
    found: list[str] = []
    for plan in plans:
        label = plan.data.row_label
        without = plan.model_copy(update={"data": plan.data.model_copy(update={"row_label": None})})
        want = None if label is None else wanted_of(without).get(label)
        if want is not None and want.place not in found:
            found.append(want.place)
    return tuple(found)


def hashed_table(path: Path) -> Read:
    """What reads a table whose labels are hashes: rows stay in the order in which they were packed."""

    def read(plan: Plan) -> Table:
        table = read_table(plan, path)
        label = plan.data.row_label
        if label is None:
            return table
        text = text_of(content_of(path, str(path)), plan.data, str(path))
        cells = read_cells(text, plan.data, [label], str(path)).columns[label]
        place = {cell.strip(): number for number, cell in enumerate(cells)}
        order = np.argsort([place[one] for one in table.labels.tolist()], kind="stable")
        columns = {
            name: replace(column, values=column.values[order]) for name, column in table.columns.items()
        }
        return replace(table, columns=columns, labels=table.labels[order])

    return read


def own_table(path: Path, columns: Mapping[str, str]) -> Read:
    """What reads a recipient's own table, with its columns under the plan's names."""
    return lambda plan: read_table(plan, path, columns=columns)


def column_names(path: str | os.PathLike[str], plans: Sequence[Plan]) -> dict[str, str]:
    """The names that a table's columns have for those of the plan, from a YAML mapping.

    Raises
    ------
    DataError
        It cannot be read, names a column that no run reads, or gives two of them one name.
    """
    name = os.fspath(path)
    try:
        raw = Path(path).read_bytes()
    except OSError as error:
        reason = "there is no such file" if isinstance(error, FileNotFoundError) else "cannot be read"
        raise DataError([Fault(file=name, line=None, place="", what=reason, code="no_file")]) from None
    document = read_yaml(raw, name, error=DataError)
    named: dict[str, object] = dict(document.data)
    checked_names(named, plans, name, document.lines)
    return {str(column): str(own) for column, own in named.items()}


def checked_names(
    columns: Mapping[str, object], plans: Sequence[Plan], name: str, lines: Mapping[str, int] | None = None
) -> None:
    """Check that each name is of a column that is read, and that none is given twice.

    Raises
    ------
    DataError
        With every fault.
    """
    known = columns_read(plans)
    faults: list[Fault] = []
    taken: dict[str, str] = {}

    def add(column: str, what: str) -> None:
        line = None if lines is None else lines.get(column)
        faults.append(Fault(file=name, line=line, place=column, what=what, code="columns"))

    for column, own in columns.items():
        if column not in known:
            add(column, f"is no column that the plan reads{did_you_mean(column, known)}")
        if not isinstance(own, str) or own in NULLS:
            add(column, "needs the name of a column of the table")
        elif own in taken:
            add(column, f"is {own!r}, and so is {taken[own]!r}")
        else:
            taken[own] = column
    if faults:
        raise DataError(faults)


def unusable_label(plan_file: str, label: str, uses: Sequence[str]) -> InputError:
    """The error of a label that cannot be hashed since the plan computes with it."""
    what = f"the row label {label!r} is used by the plan itself, so it cannot be hashed: hand it over shown"
    return InputError(
        [Fault(file=plan_file, line=None, place=place, what=what, code="label_used") for place in uses]
    )
