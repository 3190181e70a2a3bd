"""The quick way through a large file: one compiled pass, given up at the first oddity.

What it accepts it reads exactly as the strict way does; what it cannot vouch for it hands back, and
the strict way then names the faults.
"""

from __future__ import annotations

import csv
import io
from collections.abc import Mapping
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from beforehand.plan.variables import Data
from beforehand.table.conversion import Texts
from beforehand.table.wanted import Wanted

# Below this the strict way is quick enough, and nothing heavy is imported.
SMALLEST = 4 << 20

# Bytes looked at in one go.
_PIECE = 1 << 22

# Encodings in which a separator and a line end are single bytes that stand for nothing else.
_BYTEWISE = frozenset({"utf-8", "utf-8-sig", "ascii", "latin-1", "iso8859-1", "iso-8859-1", "cp1252"})


def quick_columns(
    content: bytes, data: Data, wanted: Mapping[str, Wanted], file: Path | None = None
) -> dict[str, NDArray[np.float64] | Texts] | None:
    """Columns of a large file, or None when the strict way must read it.

    Parameters
    ----------
    content : bytes
        The whole file, unpacked.
    data : Data
    wanted : mapping of name to Wanted
    file : path, optional
        The file that holds just this content, which pandas reads faster than bytes in memory.

    Returns
    -------
    dict or None
        Numbers as float64 with NaN for missing; texts as objects with None for missing.
    """
    encoding = data.encoding.lower()
    if encoding not in _BYTEWISE or len(data.separator) != 1 or "" not in data.missing_codes:
        return None
    header = _header(content, data)
    if b"\x00" in content or len(set(header)) < len(header):
        return None
    import pandas as pd

    codes = list(data.missing_codes)
    numbers = [name for name, column in wanted.items() if column.kind == "number"]
    options: dict[str, Any] = {}
    if int(pd.__version__.split(".")[0]) < 3:
        # The default parser of pandas 2 misses the last bit of every third double.
        options["float_precision"] = "round_trip"
    readable = file is not None and encoding.startswith("utf-8")
    before = _state(file) if file is not None else None
    try:
        frame = pd.read_csv(
            file if file is not None and readable else io.BytesIO(content),
            sep=data.separator,
            decimal=data.decimal,
            # A mark of byte order is passed over; without it in the name the fastest reader is used.
            encoding="utf-8" if encoding.startswith("utf-8") else encoding,
            # Choosing columns takes pandas longer than reading them all.
            usecols=None if set(header) == set(wanted) else list(wanted),
            dtype={name: "float64" if column.kind == "number" else object for name, column in wanted.items()},
            na_values=dict.fromkeys(numbers, codes),
            keep_default_na=False,
            index_col=None,
            skip_blank_lines=False,
            engine="c",
            compression=None,
            **options,
        )
    except (ValueError, OverflowError, UnicodeError, pd.errors.ParserError):
        return None
    if file is not None and _state(file) != before:
        # Written to in the meantime: what was looked at is the content, and that is read.
        return None
    if not isinstance(frame.index, pd.RangeIndex) or not (
        _full_to_the_end(content, frame, header, wanted) or _even(content, data)
    ):
        return None
    return _checked(frame, data, wanted)


def _header(content: bytes, data: Data) -> list[str]:
    """Names of all columns, in the order of the file."""
    first = content[: content.find(b"\n")].removeprefix(b"\xef\xbb\xbf")
    text = first.decode(data.encoding, errors="replace").removesuffix("\r")
    return next(csv.reader([text], delimiter=data.separator), [])


def _full_to_the_end(content: bytes, frame: Any, header: list[str], wanted: Mapping[str, Wanted]) -> bool:
    """Whether each line has a number in the last column, so that none is short or blank.

    Lines that are too long are pandas' own fault. Quotes and bare carriage returns need a closer look.
    """
    last = header[-1:]
    if b'"' in content or b"\r" in content or not last or last[0] not in wanted:
        return False
    return wanted[last[0]].kind == "number" and not bool(frame[last[0]].isna().any())


def _state(file: Path) -> tuple[int, int, int]:
    """What changes when a file is written to."""
    found = file.stat()
    return found.st_ino, found.st_size, found.st_mtime_ns


def _even(content: bytes, data: Data) -> bool:
    """Whether every line has as many cells as the header; pandas would fill short lines in silence."""
    separator = data.separator.encode()
    if b'"' in content:
        return _even_quoted(content, data)
    first = content.find(b"\n")
    cells = content.count(separator, 0, first)
    if first < 0 or cells == 0:
        return False
    if b"\r" in content and content.count(b"\r") != content.count(b"\r\n"):
        return False
    # Of separators and line ends in their order, each so-many-th is a line end and no other is.
    symbols = np.frombuffer(content, dtype=np.uint8)
    seen = 0
    for start in range(0, len(symbols), _PIECE):
        piece = symbols[start : start + _PIECE]
        ends = piece == ord("\n")
        marks = ends[np.flatnonzero(ends | (piece == ord(separator)))]
        due = np.zeros(len(marks), dtype=bool)
        due[cells - seen % (cells + 1) :: cells + 1] = True
        if not np.array_equal(marks, due):
            return False
        seen += len(marks)
    return seen % (cells + 1) == (0 if content.endswith(b"\n") else cells)


def _even_quoted(content: bytes, data: Data) -> bool:
    """The same for a file with quotes, which only a reader of cells can count."""
    try:
        text = io.TextIOWrapper(io.BytesIO(content), encoding=data.encoding, newline="")
        rows = csv.reader(text, delimiter=data.separator, strict=True)
        cells = len(next(rows))
        return all(len(row) == cells for row in rows)
    except (csv.Error, UnicodeError):
        return False


def _checked(
    frame: Any, data: Data, wanted: Mapping[str, Wanted]
) -> dict[str, NDArray[np.float64] | Texts] | None:
    """The frame's columns one by one, or None for a value that the strict way would refuse."""
    missing = frozenset(data.missing_codes)
    found: dict[str, NDArray[np.float64] | Texts] = {}
    for name, column in wanted.items():
        # Taken out as they are converted, so that only one column is held twice.
        series = frame.pop(name)
        if column.kind == "number":
            values = np.array(series.to_numpy(), dtype=np.float64)
            if np.isinf(values).any():
                return None
            # Minus zero is zero: the sign of nothing must not change a fingerprint.
            found[name] = np.add(values, 0.0, out=values)
        else:
            texts = np.empty(len(series), dtype=object)
            texts[:] = [
                None if (stripped := cell.strip()) in missing or cell in missing else stripped
                for cell in series.tolist()
            ]
            found[name] = texts
    return found
