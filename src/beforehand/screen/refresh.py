"""What a refresh came to: the verdict with its reasons, rows, coefficients, drift."""

from __future__ import annotations

from typing import TYPE_CHECKING

from beforehand.screen.digits import count, figure, p_text, percent
from beforehand.screen.layout import INDENT, Column, Section, Tone, labelled, page, shown, table, wrapped

if TYPE_CHECKING:
    from beforehand.refreshing import MovedCoefficient, Refreshed
    from beforehand.refreshing.drift import Drift

MOST_REASONS = 30

# Drift of at least so many old standard deviations, or of such a share, is shown on the screen: a
# small effect (Cohen 1988, p. 25-26). The record has all of it.
NOTICEABLE = 0.2
NOTICEABLE_SHARE = 0.1

_TITLES = {
    "holds": "Holds: the answer stands on the refreshed data",
    "moved": "Moved: the answer is the same kind, not the same numbers",
    "broken": "Broken: the answer does not stand on the refreshed data",
}


def refreshed_text(
    found: Refreshed, record: str, lock: str, *, width: int = 100, colour: bool = False
) -> str:
    """A refresh as text.

    Parameters
    ----------
    found : Refreshed
    record, lock : str
        Names of the refresh record and the new lockfile.
    width : int
        Cells of a line; 60 to 140 look right.
    colour : bool
        Whether headings are set off by terminal colours.
    """
    tone: Tone = "good" if found.verdict == "holds" else "careful"
    reasons = [line for text in found.reasons[:MOST_REASONS] for line in wrapped(text, width, first="  - ")]
    left = len(found.reasons) - MOST_REASONS
    if left > 0:
        reasons.append(f"{INDENT}{left:,} more reasons stand in the record.")
    if not found.reasons:
        reasons = list(wrapped("Nothing moved by more than the plan tolerates.", width))
    sections = [
        Section(title=_TITLES[found.verdict], lines=tuple(reasons), tone=tone),
        Section(title="Rows", lines=_rows(found, width)),
        Section(title="Coefficients, old and new", lines=_coefficients(found, width)),
        Section(title="The old equation on rows it has not seen", lines=_unseen(found, width)),
        Section(title="Drift of the columns", lines=_drift(found, width)),
        Section(title="The record", lines=_record(found, record, lock, width)),
    ]
    return page([section for section in sections if section.lines], colour=colour)


def _rows(found: Refreshed, width: int) -> tuple[str, ...]:
    """How many rows came, went and changed."""
    rows = found.rows
    if rows is None:
        return ()
    how = "" if rows.matched_by == "label" else " Rows have no labels and are matched by content."
    told = (
        f"{len(rows.new):,} new, {len(rows.gone):,} gone, {len(rows.revised):,} revised, "
        f"{len(rows.same):,} the same.{how}"
    )
    return wrapped(told, width)


def _coefficients(found: Refreshed, width: int) -> tuple[str, ...]:
    """Each coefficient with its shift and what made it."""
    terms = found.coefficients
    if not terms:
        return ()
    columns = (
        Column(head="", texts=tuple(shown(term.term) for term in terms), align="left", least=10),
        Column(head="Old", texts=tuple(figure(term.old) for term in terms)),
        Column(head="New", texts=tuple(figure(term.new) for term in terms)),
        Column(head="Shift", texts=tuple(_shift(term) for term in terms)),
        Column(head="New rows", texts=tuple(figure(term.from_new_rows) for term in terms)),
        Column(head="Gone rows", texts=tuple(figure(term.from_gone_rows) for term in terms)),
        Column(head="Revised rows", texts=tuple(figure(term.from_revised_rows) for term in terms)),
        Column(head="Another form", texts=tuple(figure(term.from_other_form) for term in terms)),
    )
    told = (
        "The shift is in standard errors of the old answer; beside it, in the coefficient's unit, the "
        "parts of it that rows and another form of the model made."
    )
    for chosen in (columns, columns[:4]):
        lines = table(chosen, width)
        if lines:
            return (*lines, *wrapped(told if chosen is columns else told.partition(";")[0] + ".", width))
    return labelled(
        tuple((shown(term.term), f"{figure(term.old)}, now {figure(term.new)}") for term in terms), width
    )


def _shift(term: MovedCoefficient) -> str:
    return "" if term.shift_in_old_se is None else f"{term.shift_in_old_se:+.2f}"


def _unseen(found: Refreshed, width: int) -> tuple[str, ...]:
    """Prediction error and Chow's test."""
    lines: list[str] = []
    made = found.prediction
    if made is not None:
        lines += wrapped(
            f"On {count(made.rows, 'row')} it errs by {figure(made.typical_error)} typically, "
            f"{made.ratio:.2f} times the {figure(made.old_residual_sd)} of the old fit; "
            f"on average it is off by {figure(made.mean_error)}.",
            width,
        )
    chow = found.chow
    if chow is not None:
        against = "a line of their own" if chow.form == "two_lines" else "predictions of the old line"
        lines += wrapped(
            f"One line for old and new rows, held against {against} (Chow 1960): "
            f"F {figure(chow.f)} on {chow.df[0]} and {chow.df[1]}, p {p_text(chow.p)}.",
            width,
        )
    return tuple(lines)


def _drift(found: Refreshed, width: int) -> tuple[str, ...]:
    """Columns that have drifted noticeably."""
    told = [text for one in found.drift if (text := _drifted(one))]
    if not found.drift:
        return ()
    if not told:
        return wrapped("No column has drifted noticeably.", width)
    return tuple(line for text in told for line in wrapped(text, width, first="  - "))


def _drifted(one: Drift) -> str:
    parts: list[str] = []
    if one.standardized_difference is not None and abs(one.standardized_difference) >= NOTICEABLE:
        parts.append(f"its mean is {one.standardized_difference:+.2f} old standard deviations off")
    elif one.ks_p is not None and one.ks_p < 0.01 and one.ks is not None and one.ks >= NOTICEABLE_SHARE:
        parts.append(f"its distribution is another (distance {one.ks:.2f}, p {p_text(one.ks_p)})")
    if one.total_variation is not None and one.total_variation >= NOTICEABLE_SHARE:
        parts.append(f"{percent(one.total_variation)} of its rows have moved to other levels")
    if one.levels_new:
        parts.append(f"{', '.join(map(shown, one.levels_new))} is new")
    if abs(one.new_out_of_range - one.old_out_of_range) >= 0.01:
        parts.append(f"{percent(one.new_out_of_range)} is out of range, was {percent(one.old_out_of_range)}")
    if one.levels_gone:
        parts.append(f"no row has {', '.join(map(shown, one.levels_gone))} any more")
    if abs(one.new_missing - one.old_missing) >= NOTICEABLE_SHARE:
        parts.append(f"{percent(one.new_missing)} is missing, was {percent(one.old_missing)}")
    return f"{shown(one.column)}: {'; '.join(parts)}." if parts else ""


def _record(found: Refreshed, record: str, lock: str, width: int) -> tuple[str, ...]:
    learned = (
        "Fills and exponents were taken from the old record."
        if found.learned == "replay"
        else "Fills and exponents were learned anew."
    )
    new = f"{record} holds the comparison"
    new += "; there is no new lockfile." if found.lock is None else f", {lock} the new run. {learned}"
    return wrapped(new, width)
