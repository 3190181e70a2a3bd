"""Predictions for other programs: CSV that a spreadsheet cannot take for formulas, and plain data."""

from __future__ import annotations

import csv
import io
from typing import Any

from beforehand.lock.numbers import SIGNIFICANT_DIGITS
from beforehand.predicting.whole import PredictedCase, Predictions

COLUMNS = ("prediction", "mean_low", "mean_high", "case_low", "case_high", "outside")

# A spreadsheet computes a cell that begins with one of these, also behind blanks.
_FORMULA_SIGNS = ("=", "+", "-", "@", "\t", "\r")


def csv_text(found: Predictions) -> str:
    """Predictions as CSV, in the order of the new table.

    Returns
    -------
    str
        A header, a line for each case and LF line ends. Numbers have ten digits; what does not exist
        is an empty cell. Text that a spreadsheet would compute has an apostrophe before it.
    """
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow([safe_cell(found.label), *COLUMNS])
    for case in found.cases:
        writer.writerow(
            [safe_cell(case.label), *map(_number, _numbers(case)), safe_cell("; ".join(case.outside))]
        )
    return out.getvalue()


def as_mapping(found: Predictions) -> dict[str, Any]:
    """Predictions as plain data for JSON; labels and reasons as they are."""
    return {
        "outcome": found.outcome,
        "unit": found.unit,
        "level": found.level,
        "status": found.status,
        "equation": found.equation,
        "label": found.label,
        "cases": [
            {
                "label": case.label,
                **dict(zip(COLUMNS, _numbers(case), strict=False)),
                "outside": list(case.outside),
                "filled": list(case.filled),
            }
            for case in found.cases
        ],
        "outside": found.outside,
        "unpredicted": found.unpredicted,
        "cautions": list(found.cautions),
    }


def safe_cell(text: str) -> str:
    """Text for a cell, with an apostrophe before what a spreadsheet would compute."""
    return f"'{text}" if text.startswith(_FORMULA_SIGNS) or text.lstrip().startswith(_FORMULA_SIGNS) else text


def _numbers(case: PredictedCase) -> tuple[float | None, ...]:
    """The numbers of a case, in the order of the columns."""
    return case.prediction, case.mean_low, case.mean_high, case.case_low, case.case_high


def _number(value: float | None) -> str:
    """A number as it stands in a cell."""
    return "" if value is None else f"{value + 0.0:.{SIGNIFICANT_DIGITS}g}"
