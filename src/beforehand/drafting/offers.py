"""What a draft offers: columns as predictors, as a label of rows, as their order, or not at all."""

from __future__ import annotations

import math
from dataclasses import dataclass
from decimal import ROUND_CEILING, ROUND_FLOOR, Decimal

from beforehand.fields import plain
from beforehand.table.profile import ColumnProfile, FileProfile

# A range is rounded outward to steps of 1, 2 or 5 times a power of ten, about so many to what was seen.
_STEPS = 5

# A number with no more different values may be a code of levels.
_FEW_VALUES = 6


@dataclass(frozen=True, slots=True, kw_only=True)
class Offers:
    """What the columns of a table are offered as.

    Attributes
    ----------
    predictors : tuple of str
        One entry of the plan's list each, with its comment.
    label : str or None
        Column that labels the rows.
    dates : tuple of str
        Columns of dates.
    left_out : tuple of str
        Columns that are not offered as predictors, each with the reason.
    """

    predictors: tuple[str, ...]
    label: str | None
    dates: tuple[str, ...]
    left_out: tuple[str, ...]


def offers_of(profile: FileProfile, outcome: str) -> Offers:
    """Offer each column but the outcome as what it looks like."""
    columns = [column for column in profile.columns if column.name != outcome and column.kind != "outcome"]
    named = [column for column in columns if all(nameable(text) for text in (column.name, *column.levels))]
    labels = [column.name for column in named if column.kind == "label" and not column.share_missing]
    counters = [column.name for column in named if _counts_rows(column, profile.rows)]
    label = next(iter([*labels, *counters]), None)
    offered = [column for column in named if column.kind in ("number", "category")]
    offered = [column for column in offered if column.name not in counters]
    return Offers(
        predictors=tuple(_predictor(column) for column in offered),
        label=label,
        dates=tuple(column.name for column in named if column.kind == "date"),
        left_out=tuple(
            f"{shown_name(column.name)}: {_reason(column, label)}"
            for column in columns
            if column not in offered
        ),
    )


def shown_name(name: str) -> str:
    """A name as it can stand in a comment."""
    return name if name.isprintable() else ascii(name)


def nameable(name: str) -> bool:
    """Whether a plan can name a column: text on one line."""
    return bool(name.strip()) and "\n" not in name and "\r" not in name


def _counts_rows(column: ColumnProfile, rows: int) -> bool:
    """Whether a column of numbers does no more than number the rows."""
    if column.kind != "number" or column.minimum is None or column.maximum is None:
        return False
    whole = column.whole and not column.share_missing and column.distinct == rows
    return whole and rows > 2 and column.maximum - column.minimum == rows - 1


def _predictor(column: ColumnProfile) -> str:
    """One entry of the list of predictors."""
    parts = [f"column: {plain(column.name)}", f"kind: {column.kind}"]
    notes: list[str] = []
    if column.kind == "number":
        bounds = possible_range(column.minimum, column.maximum)
        if bounds is not None:
            parts.append(f"range: {plain(bounds)}")
        notes.append(f"seen {plain(column.minimum)} to {plain(column.maximum)}")
        if column.distinct <= _FEW_VALUES:
            notes.append(f"{column.distinct} values: a category?")
    else:
        parts += [f"levels: {plain(column.levels)}", f"baseline: {plain(column.levels[0])}"]
        notes.append("please choose the baseline")
    parts.append("role: candidate")
    if column.share_missing:
        notes.append(f"{max(100.0 * column.share_missing, 0.1):.2g} % missing")
    return f"{{{', '.join(parts)}}}  # {'; '.join(notes)}"


def possible_range(low: float | None, high: float | None) -> tuple[float, float] | None:
    """What was seen, rounded outward to sensible numbers; None for a single value.

    Examples
    --------
    >>> possible_range(-12.3, 38.1)
    (-20.0, 40.0)
    >>> possible_range(0.12, 0.87)
    (0.1, 0.9)
    """
    if low is None or high is None or not low < high or not math.isfinite(high - low):
        return None
    # Decimal, because 3 times 0.1 is to be 0.3 here.
    least, most = Decimal(repr(low)), Decimal(repr(high))
    step = _step(most - least)
    down = (least / step).to_integral_value(ROUND_FLOOR) * step
    up = (most / step).to_integral_value(ROUND_CEILING) * step
    return min(float(down), low) + 0.0, max(float(up), high) + 0.0


def _step(span: Decimal) -> Decimal:
    """The largest of 1, 2 and 5 times a power of ten that is not above a fraction of the span."""
    wanted = span / _STEPS
    power = Decimal(1).scaleb(wanted.adjusted())
    return next(factor * power for factor in (5, 2, 1) if factor * power <= wanted)


def _reason(column: ColumnProfile, label: str | None) -> str:
    """Why a column is not offered as a predictor."""
    if not nameable(column.name):
        return "a plan cannot name it; rename the column"
    reasons = {
        "label": "labels the rows" if column.name == label else "a different text in each row",
        "number": "labels the rows" if column.name == label else "numbers the rows",
        "date": "dates; derive a number where one is wanted",
        "constant": "one value only",
        "empty": "no value",
        "category": "a level runs over more than one line",
        "text": f"{column.distinct:,} different texts; a category needs a few levels",
    }
    return reasons[column.kind]
