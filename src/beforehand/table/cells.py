"""A delimited text file to cells: every line counted, every oddity a fault with its line."""

from __future__ import annotations

import csv
import gzip
import io
import zlib
from collections.abc import Collection
from dataclasses import dataclass
from pathlib import Path

from beforehand.faults import DataError, Fault, did_you_mean
from beforehand.plan.variables import Data

# At most so many lines or rows are named in one fault; the rest are counted.
NAMED = 5

# A cell longer than this is a file that is not a table of cells.
LONGEST_CELL = 1 << 20

_SIGNATURES = (
    (b"PK\x03\x04", "a spreadsheet or an archive, not a text table: save the sheet as CSV"),
    (b"\xd0\xcf\x11\xe0", "a spreadsheet of an old kind, not a text table: save the sheet as CSV"),
    (b"%PDF", "a PDF file, not a text table"),
    (b"PAR1", "a Parquet file, not a text table"),
)


@dataclass(frozen=True, slots=True, kw_only=True)
class Cells:
    """Cells of the wanted columns as text, in file order.

    ``lines`` holds the line of the file on which each row begins, from 1.
    """

    columns: dict[str, list[str]]
    lines: list[int]


def fault(file: str, line: int | None, place: str, what: str, code: str) -> Fault:
    """A fault of a table."""
    return Fault(file=file, line=line, place=place, what=what, code=code)


def named(items: list[str]) -> str:
    """The first few of a list, and how many more there are."""
    shown = ", ".join(items[:NAMED])
    return shown if len(items) <= NAMED else f"{shown} and {len(items) - NAMED:,} more"


def content_of(path: Path, name: str) -> bytes:
    """The bytes of a file, unpacked when it is gzipped.

    Raises
    ------
    DataError
        When it cannot be read, is empty, or is no text.
    """
    try:
        content = path.read_bytes()
    except FileNotFoundError:
        raise DataError([fault(name, None, "", "there is no such file", "no_file")]) from None
    except IsADirectoryError:
        raise DataError([fault(name, None, "", "is a folder, not a file", "no_file")]) from None
    except OSError as error:
        raise DataError([fault(name, None, "", f"cannot be read: {error.strerror}", "unreadable")]) from None
    if content[:2] == b"\x1f\x8b":
        try:
            content = gzip.decompress(content)
        except (OSError, EOFError, zlib.error):
            raise DataError([fault(name, None, "", "is gzipped and damaged", "gzip")]) from None
    for signature, what in _SIGNATURES:
        if content.startswith(signature):
            raise DataError([fault(name, None, "", f"is {what}", "not_text")])
    if not content or content.isspace():
        raise DataError([fault(name, None, "", "is empty", "empty")])
    return content


def text_of(content: bytes, data: Data, name: str) -> str:
    """The text of a file in its declared encoding, without a byte-order mark."""
    encoding = data.encoding
    try:
        text = content.decode(encoding)
    except UnicodeDecodeError as error:
        line = content.count(b"\n", 0, error.start) + 1
        what = f"is not {encoding}: byte {error.start:,} cannot be read (declare data.encoding)"
        raise DataError([fault(name, line, "", what, "encoding")]) from None
    if "\x00" in text:
        line = text.count("\n", 0, text.index("\x00")) + 1
        raise DataError([fault(name, line, "", "holds a NUL character: it is no text table", "not_text")])
    return text.removeprefix("\ufeff")


def read_cells(text: str, data: Data, wanted: Collection[str], name: str) -> Cells:
    """Cells of the wanted columns.

    Raises
    ------
    DataError
        For columns that are missing or repeated, lines with too few or too many cells, a quote that
        is not closed, and a table without rows.
    """
    csv.field_size_limit(LONGEST_CELL)
    reader = csv.reader(io.StringIO(text, newline=""), delimiter=data.separator, strict=True)
    try:
        header = [cell.strip() for cell in next(reader)]
        places = places_of(header, wanted, data, name)
        columns: dict[str, list[str]] = {column: [] for column in places}
        lines: list[int] = []
        ragged: list[tuple[int, int]] = []
        begins = reader.line_num + 1
        width = len(header)
        for row in reader:
            if not row and width > 1:
                begins = reader.line_num + 1
                continue
            row = row or [""]
            if len(row) != width:
                ragged.append((begins, len(row)))
            else:
                lines.append(begins)
                for column, place in places.items():
                    columns[column].append(row[place])
            begins = reader.line_num + 1
    except csv.Error as error:
        what = f"cannot be read as cells: {error}"
        raise DataError([fault(name, reader.line_num, "", what, "quoting")]) from None
    if ragged:
        raise DataError(list(ragged_faults(ragged, width, name)))
    if not lines:
        raise DataError([fault(name, None, "", "has a header and no rows", "no_rows")])
    return Cells(columns=columns, lines=lines)


def ragged_faults(ragged: list[tuple[int, int]], width: int, name: str) -> list[Fault]:
    """Lines whose number of cells is not the header's."""
    first, found = ragged[0]
    others = [str(line) for line, _ in ragged[1:]]
    more = f" (also line {named(others)})" if others else ""
    cells = "cell" if found == 1 else "cells"
    what = f"the line has {found} {cells} and the header {width}{more}"
    return [fault(name, first, "", what, "ragged")]


def places_of(header: list[str], wanted: Collection[str], data: Data, name: str) -> dict[str, int]:
    """Place of each wanted column in the header.

    Raises
    ------
    DataError
        For a wanted column that is missing, or a name that stands twice.
    """
    faults: list[Fault] = []
    seen: set[str] = set()
    for cell in header:
        if cell and cell in seen:
            faults.append(fault(name, 1, cell, "the column stands twice in the header", "repeated_column"))
        seen.add(cell)
    for column in wanted:
        if column not in seen:
            what = "the table has no such column" + did_you_mean(column, [cell for cell in header if cell])
            if len(header) == 1 and not did_you_mean(column, header):
                what += f"; its header is one cell with the separator {data.separator!r}"
            faults.append(fault(name, 1, column, what, "no_column"))
    if faults:
        raise DataError(faults)
    return {column: header.index(column) for column in wanted}
