"""What the columns of a file look like, for a draft; the outcome's values are not looked at."""

from __future__ import annotations

import csv
import io
import os
import re
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Literal

from beforehand.faults import DataError
from beforehand.plan.variables import Data
from beforehand.table.cells import content_of, fault, read_cells, text_of
from beforehand.table.conversion import numbers_of

Guess = Literal["number", "category", "label", "date", "constant", "empty", "text", "outcome"]

# Cells that are taken as missing in a profile: the default of the language and what else is common.
COMMON_CODES = ("", "NA", "-", "n/a", "N/A", "null", "?", ".")
SEPARATORS = (",", ";", "\t", "|")

# A text column with no more levels than this is offered as a category.
MOST_LEVELS = 20

# Lines that are looked at to see the separator.
_SNIFFED = 50

_DATE = re.compile(r"[0-9]{4}-[0-9]{2}-[0-9]{2}([T ][0-9:.]+)?")


@dataclass(frozen=True, slots=True, kw_only=True)
class ColumnProfile:
    """One column of a file.

    Attributes
    ----------
    name : str
    kind : str
        What the column is guessed to be; ``outcome`` for the outcome, of which nothing else is said.
    share_missing : float
        Share of cells that hold a common missing code.
    minimum, maximum : float or None
        Of a number.
    whole : bool
        Every number is whole.
    decimals : int
        Most digits after the decimal mark.
    levels : tuple of str
        Of a category, sorted.
    distinct : int
        Different values that are not missing.
    """

    name: str
    kind: Guess
    share_missing: float = 0.0
    minimum: float | None = None
    maximum: float | None = None
    whole: bool = False
    decimals: int = 0
    levels: tuple[str, ...] = ()
    distinct: int = 0


@dataclass(frozen=True, slots=True, kw_only=True)
class FileProfile:
    """How a file is written and what its columns look like.

    Attributes
    ----------
    file : str
    rows : int
    separator, decimal : str
    missing_codes : tuple of str
        The language's default and those that were seen.
    columns : tuple of ColumnProfile
        In the order of the file.
    """

    file: str
    rows: int
    separator: str
    decimal: Literal[".", ","]
    missing_codes: tuple[str, ...]
    columns: tuple[ColumnProfile, ...]


def profile_file(
    path: str | os.PathLike[str], outcome: str, *, separator: str | None = None, encoding: str = "utf-8"
) -> FileProfile:
    """Profile a delimited text file.

    Parameters
    ----------
    path : path
    outcome : str
        Column that is checked for existence only.
    separator : str, optional
        Without it the sign that cuts the first lines into equally many cells.
    encoding : str

    Raises
    ------
    DataError
        When the file cannot be read or has no such column.
    """
    name = str(path)
    content = content_of(Path(path), name)
    text = text_of(content, Data(file=Path(path).name, encoding=encoding), name)
    sign = separator if separator is not None else _separator(text)
    data = Data(file=Path(path).name, separator=sign, encoding=encoding)
    header = [cell.strip() for cell in next(csv.reader(io.StringIO(text, newline=""), delimiter=sign))]
    named = [cell for cell in header if cell]
    if outcome not in named:
        named.append(outcome)
    cells = read_cells(text, data, dict.fromkeys(named), name)
    decimal = _decimal([column for key, column in cells.columns.items() if key != outcome], sign)
    seen = {cell.strip() for key, column in cells.columns.items() if key != outcome for cell in column}
    codes = (*COMMON_CODES[:3], *(code for code in COMMON_CODES[3:] if code in seen))
    columns = tuple(
        ColumnProfile(name=column, kind="outcome")
        if column == outcome
        else _profile(column, cells.columns[column], decimal, codes)
        for column in named
    )
    if not columns:
        raise DataError([fault(name, 1, "", "the header names no column", "no_column")])
    return FileProfile(
        file=Path(path).name, rows=len(cells.lines), separator=sign, decimal=decimal,
        missing_codes=codes, columns=columns,
    )  # fmt: skip


def _separator(text: str) -> str:
    """The sign that cuts the first lines into equally many cells, and into most."""
    lines = io.StringIO("\n".join(text.splitlines()[:_SNIFFED]), newline="")
    best, most = ",", 1
    for sign in SEPARATORS:
        lines.seek(0)
        try:
            widths = {len(row) for row in csv.reader(lines, delimiter=sign) if row}
        except csv.Error:
            continue
        if len(widths) == 1 and (width := widths.pop()) > most:
            best, most = sign, width
    return best


def _decimal(columns: Sequence[Sequence[str]], separator: str) -> Literal[".", ","]:
    """The decimal mark: a comma where cells read as numbers with one and none with a point."""
    if separator == ",":
        return "."
    comma = point = 0
    for column in columns:
        for cell in column:
            comma += bool(re.fullmatch(r"\s*[+-]?[0-9]+,[0-9]+\s*", cell))
            point += bool(re.fullmatch(r"\s*[+-]?[0-9]+\.[0-9]+\s*", cell))
    return "," if comma > point else "."


def _profile(
    name: str, cells: Sequence[str], decimal: Literal[".", ","], codes: tuple[str, ...]
) -> ColumnProfile:
    """One column, by what all of its cells that are not missing have in common."""
    present = [cell.strip() for cell in cells if cell.strip() not in codes]
    share = 1.0 - len(present) / len(cells)
    distinct = sorted(set(present))
    if not present:
        return ColumnProfile(name=name, kind="empty", share_missing=share)
    if len(distinct) == 1:
        return ColumnProfile(
            name=name, kind="constant", share_missing=share, levels=tuple(distinct), distinct=1
        )
    if all(_DATE.fullmatch(cell) for cell in distinct):
        return ColumnProfile(name=name, kind="date", share_missing=share, distinct=len(distinct))
    values, faults = numbers_of(present, Data(file="table.csv", decimal=decimal), "", name, str, ())
    if not faults:
        decimals = max(len(cell.partition(decimal)[2]) for cell in distinct)
        return ColumnProfile(
            name=name, kind="number", share_missing=share, minimum=float(values.min()),
            maximum=float(values.max()), whole=bool((values == values.round()).all()), decimals=decimals,
            distinct=len(distinct),
        )  # fmt: skip
    if len(distinct) == len(cells):
        return ColumnProfile(name=name, kind="label", share_missing=share, distinct=len(distinct))
    if len(distinct) <= MOST_LEVELS:
        return ColumnProfile(
            name=name, kind="category", share_missing=share, levels=tuple(distinct), distinct=len(distinct)
        )
    return ColumnProfile(name=name, kind="text", share_missing=share, distinct=len(distinct))
