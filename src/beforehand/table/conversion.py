"""Cells to numbers and texts, exactly and strictly; what does not fit is named with its rows."""

from __future__ import annotations

import math
import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from beforehand.faults import Fault
from beforehand.plan.variables import Data
from beforehand.table.cells import NAMED, fault, named

# What Python's float takes is wider: underscores, digits of other scripts, nan, inf, blanks inside.
_NUMBER = re.compile(r"[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?")

Texts = NDArray[np.object_]


@dataclass(slots=True)
class Odd:
    """Cells of one column that do not fit, by what is wrong with them."""

    rows: dict[str, list[int]] = field(default_factory=dict)

    def add(self, what: str, row: int) -> None:
        """Note a row."""
        self.rows.setdefault(what, []).append(row)


def numbers_of(
    cells: Sequence[str],
    data: Data,
    name: str,
    column: str,
    row_name: Callable[[int], str],
    lines: Sequence[int],
) -> tuple[NDArray[np.float64], list[Fault]]:
    """Numbers of a column, NaN where a missing code stands, and the faults of the rest."""
    missing = frozenset(data.missing_codes)
    values = np.empty(len(cells))
    odd = Odd()
    comma = data.decimal == ","
    for row, raw in enumerate(cells):
        cell = raw.strip()
        if cell in missing or raw in missing:
            values[row] = math.nan
            continue
        text = cell.replace(",", ".") if comma and "." not in cell else cell
        if _NUMBER.fullmatch(text) is None or (comma and "." in cell):
            odd.add(_complaint(cell, data), row)
            continue
        value = float(text)
        if math.isinf(value):
            odd.add(f"{_short(cell)} is beyond the largest number", row)
            continue
        values[row] = value + 0.0
    return values, _faults(odd, name, column, row_name, lines)


def _short(cell: str) -> str:
    """A cell for a message."""
    return repr(cell if len(cell) <= 24 else cell[:23] + "…")


def _complaint(cell: str, data: Data) -> str:
    """Why a cell is no number, with what would be right where that is plain."""
    if not cell:
        return 'an empty cell is not a number (declare "" in data.missing_codes if it means missing)'
    other = "," if data.decimal == "." else "."
    if _NUMBER.fullmatch(cell.replace(other, ".")) and cell.count(other) == 1:
        return f"{_short(cell)} is not a number with the decimal mark {data.decimal!r} (declare data.decimal)"
    if cell.lower().lstrip("+-") in ("inf", "infinity"):
        return f"{_short(cell)} is infinite"
    return f"{_short(cell)} is not a number"


def _faults(
    odd: Odd, name: str, column: str, row_name: Callable[[int], str], lines: Sequence[int]
) -> list[Fault]:
    """One fault for each thing that is wrong, the first few of them; the rest in one line."""
    found: list[Fault] = []
    for what, rows in list(odd.rows.items())[:NAMED]:
        where = named([row_name(row) for row in rows])
        plural = "row" if len(rows) == 1 else "rows"
        found.append(
            fault(
                name, lines[rows[0]] if lines else None, column, f"{what} ({plural} {where})", "not_a_number"
            )
        )
    rest = list(odd.rows.values())[NAMED:]
    if rest:
        rows = [row for group in rest for row in group]
        where = named([row_name(row) for row in rows])
        what = f"{len(rest):,} more values are not numbers (rows {where})"
        found.append(fault(name, lines[rows[0]] if lines else None, column, what, "not_a_number"))
    return found


def texts_of(cells: Sequence[str], data: Data) -> Texts:
    """Texts of a column, stripped; None where a missing code stands."""
    missing = frozenset(data.missing_codes)
    texts = np.empty(len(cells), dtype=object)
    texts[:] = [
        None if (stripped := cell.strip()) in missing or cell in missing else stripped for cell in cells
    ]
    return texts
