"""The quick way through a large file: one compiled pass, given up at the first oddity.

What it accepts it reads exactly as the strict way does; what it cannot vouch for it hands back, and
the strict way then names the faults.
"""

from __future__ import annotations

import csv
import io
from collections.abc import Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

from beforehand.plan.variables import Data
from beforehand.table.conversion import Texts
from beforehand.table.wanted import Wanted

# Below this the strict way is quick enough, and nothing heavy is imported.
SMALLEST = 4 << 20

# Encodings in which a separator and a line end are single bytes that stand for nothing else.
_BYTEWISE = frozenset({"utf-8", "utf-8-sig", "ascii", "latin-1", "iso8859-1", "iso-8859-1", "cp1252"})


def quick_columns(
    content: bytes, data: Data, wanted: Mapping[str, Wanted]
) -> dict[str, NDArray[np.float64] | Texts] | None:
    """Columns of a large file, or None when the strict way must read it.

    Parameters
    ----------
    content : bytes
        The whole file, unpacked.
    data : Data
    wanted : mapping of name to Wanted

    Returns
    -------
    dict or None
        Numbers as float64 with NaN for missing; texts as objects with None for missing.
    """
    encoding = data.encoding.lower()
    if encoding not in _BYTEWISE or len(data.separator) != 1 or "" not in data.missing_codes:
        return None
    if b"\x00" in content or not _even(content, data):
        return None
    import pandas as pd

    codes = list(data.missing_codes)
    numbers = [name for name, column in wanted.items() if column.kind == "number"]
    options: dict[str, Any] = {}
    if int(pd.__version__.split(".")[0]) < 3:
        # The default parser of pandas 2 misses the last bit of every third double.
        options["float_precision"] = "round_trip"
    try:
        frame = pd.read_csv(
            io.BytesIO(content),
            sep=data.separator,
            decimal=data.decimal,
            encoding="utf-8-sig" if encoding.startswith("utf-8") else encoding,
            usecols=list(wanted),
            dtype={name: "float64" if column.kind == "number" else object for name, column in wanted.items()},
            na_values=dict.fromkeys(numbers, codes),
            keep_default_na=False,
            index_col=False,
            engine="c",
            **options,
        )
    except (ValueError, OverflowError, UnicodeError, pd.errors.ParserError):
        return None
    return _checked(frame, data, wanted)


def _even(content: bytes, data: Data) -> bool:
    """Whether every line has as many cells as the header; pandas would fill short lines in silence."""
    separator = data.separator.encode()
    if b'"' in content:
        return _even_quoted(content, data)
    lines = io.BytesIO(content)
    cells = lines.readline().count(separator)
    if b"\r" in content and content.count(b"\r") != content.count(b"\r\n"):
        return False
    return cells > 0 and all(line.count(separator) == cells for line in lines)


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
