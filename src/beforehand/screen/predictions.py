"""What came of predicting new cases: how many, where they stand, and what to keep in mind."""

from __future__ import annotations

from typing import TYPE_CHECKING

from beforehand.screen.digits import count
from beforehand.screen.layout import INDENT, Section, page, shown, wrapped

if TYPE_CHECKING:
    from beforehand.predicting import PredictedCase, Predictions

# So many cases outside are named; the file has them all.
NAMED = 5


def predictions_text(found: Predictions, record: str, *, width: int = 100, colour: bool = False) -> str:
    """Predictions as text: the cases are in the file, what is odd about them is here.

    Parameters
    ----------
    found : Predictions
    record : str
        Name of the file that holds them.
    width : int
        Cells of a line; 60 to 140 look right.
    colour : bool
        Whether headings are set off by terminal colours.
    """
    cases = count(len(found.cases), "case")
    unit = "" if found.unit is None else f"; {shown(found.outcome)} is in {shown(found.unit)}"
    equation = f"{shown(found.outcome)} = its mean" if found.equation is None else shown(found.equation)
    says = f"{equation}. Intervals hold at {100 * found.level:.4g} %{unit}."
    sections = [
        Section(title=f"Predicted: {cases}, {shown(record)}", lines=wrapped(says, width), tone="good")
    ]
    odd = [case for case in found.cases if case.outside]
    if odd:
        lines = [line for case in odd[:NAMED] for line in wrapped(_odd(case), width, rest=INDENT * 2)]
        if len(odd) > NAMED:
            lines.append(f"{INDENT}{len(odd) - NAMED:,} more: the last column of the file says why.")
        none = f", {found.unpredicted:,} of them without a prediction" if found.unpredicted else ""
        title = f"Outside what the fit has seen: {count(len(odd), 'case')}{none}"
        sections.append(Section(title=title, lines=tuple(lines), tone="careful"))
    filled = sum(len(case.filled) for case in found.cases)
    if filled:
        told = f"{count(filled, 'missing cell')} filled as the plan says."
        sections.append(Section(title="Missing", lines=wrapped(told, width)))
    lines = [line for said in found.cautions for line in wrapped(shown(said), width, rest=INDENT * 2)]
    sections.append(Section(title="To keep in mind", lines=tuple(lines), tone="careful"))
    return page(sections, colour=colour)


def _odd(case: PredictedCase) -> str:
    """A case with its reasons."""
    return f"{shown(case.label)}: {shown('; '.join(case.outside))}"
