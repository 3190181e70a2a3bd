"""A commented plan from the columns of a table: every rule stands in it with its default.

Of the outcome nothing is used but its name, so that a draft may be made before anything is decided.
"""

from __future__ import annotations

from collections.abc import Iterator

from beforehand.drafting.offers import Offers, nameable, offers_of, shown_name
from beforehand.drafting.rules import ABOVE, block_lines
from beforehand.faults import DataError, Fault
from beforehand.fields import plain
from beforehand.plan import LANGUAGE
from beforehand.table.profile import FileProfile

__all__ = ["draft_plan"]

# Blocks that stand before the outcome; all others follow the predictors in the order of the language.
_BEFORE = ("purpose", "eligibility", "derive")


def draft_plan(profile: FileProfile, file_name: str, outcome: str, title: str | None = None) -> str:
    """Draft a plan as text.

    Parameters
    ----------
    profile : FileProfile
        Of the table; the outcome's column has nothing but its name there.
    file_name : str
        The table as the plan names it, relative to the plan.
    outcome : str
        Column of the outcome.
    title : str or None
        What the analysis is about; made from the outcome's name when it is None.

    Returns
    -------
    str
        A plan that can be read back: the defaults of the language and the predictors of the table.

    Raises
    ------
    DataError
        When no column can be a predictor, or the outcome has no name that a plan can hold.
    """
    if not nameable(outcome):
        what = "an outcome needs a name on one line; rename the column"
        raise DataError(
            [Fault(file=file_name, line=1, place=shown_name(outcome), what=what, code="column_name")]
        )
    offers = offers_of(profile, outcome)
    if not offers.predictors:
        what = "no column beside the outcome holds numbers or a few levels, so none can be a predictor"
        raise DataError([Fault(file=file_name, line=None, place="", what=what, code="no_predictor")])
    blocks = [
        _opening(file_name, outcome, title),
        _data(profile, offers, file_name),
        *(block_lines(key, {}) for key in _BEFORE),
        _outcome(outcome),
        _predictors(offers),
        *(block_lines(key, _beside(offers)) for key in ABOVE if key not in _BEFORE),
    ]
    return "\n\n".join("\n".join(block) for block in blocks) + "\n"


def _opening(file_name: str, outcome: str, title: str | None) -> list[str]:
    """What the text is, and what only a person can write."""
    return [
        f"# A draft from the columns of {shown_name(file_name)}.",
        f"# The values of {shown_name(outcome)} were not looked at.",
        '# Every rule stands here with its default. Lines with "please" wait for what only you know.',
        "# beforehand guide first-plan: the way from here. beforehand guide BLOCK: about a block.",
        f"language: {LANGUAGE}",
        f"title: {plain(title or f'What goes with {outcome}')}",
        f"question: {plain(f'Which of these factors go with {outcome}, and by how much?')}  # please",
        "written_by: null  # please",
    ]


def _data(profile: FileProfile, offers: Offers, file_name: str) -> list[str]:
    """Where the table stands and how it is written."""
    if offers.label is None:
        label = "please, where a column names each row; without one rows are numbered"
    else:
        label = "a different entry in each row"
    return [
        "# Where the table stands, and how it is written.",
        "data:",
        f"  file: {plain(file_name)}",
        f"  row_label: {plain(offers.label)}  # {label}",
        f"  missing_codes: {plain(profile.missing_codes)}",
        "  labels_in_lock: shown  # or hashed",
        f"  separator: {plain(profile.separator)}",
        f"  decimal: {plain(profile.decimal)}",
        "  encoding: utf-8",
    ]


def _outcome(outcome: str) -> list[str]:
    """The outcome: its name, and what only a person can say of it."""
    return [
        "# What is explained. Nothing fills an outcome: a row without one leaves.",
        "outcome:",
        f"  column: {plain(outcome)}",
        "  unit: null  # please",
        "  smallest_effect_that_matters: null  # please: in its unit, for one SD of a predictor",
        "  range: null  # please: [lowest, highest] that is possible",
        "  transforms: []  # a ladder for the outcome; [] never transforms it",
    ]


def _predictors(offers: Offers) -> list[str]:
    """The predictors in the order of the table, and what is not offered as one."""
    return [
        "# The candidates. Ties go to the earlier one, so please put first what you trust more.",
        "# Please give each its unit, and the role focal (the question is about it), adjustment (it makes",
        "# the comparison fair) or candidate. Ranges are rounded outward from what was seen: please",
        "# replace them by what is possible.",
        "predictors:",
        *(f"  - {line}" for line in offers.predictors),
        *_left_out(offers),
    ]


def _left_out(offers: Offers) -> Iterator[str]:
    """Columns that are not offered, and why."""
    if offers.left_out:
        yield "# Not offered as predictors:"
        yield from (f"#   {line}" for line in offers.left_out)


def _beside(offers: Offers) -> dict[str, str]:
    """Comments that depend on the table."""
    such = f", such as {shown_name(offers.dates[0])}" if offers.dates else ""
    return {
        "assumptions.independence.in_order_of": f"please, where rows have an order: its column{such}",
        "assumptions.independence.between": "bounds for durbin_watson",
    }
