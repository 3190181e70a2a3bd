"""Checks of what a plan says about columns: files, names, kinds, ranges, levels, formulas."""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator
from pathlib import PureWindowsPath

from beforehand.plan.arithmetic import names_in
from beforehand.plan.blocks import ClusterBy
from beforehand.plan.complaint import Complaint, near, repeated, repeats
from beforehand.plan.model import Plan
from beforehand.plan.numbers import number_text
from beforehand.plan.variables import Eligibility, Predictor


def _data_file(plan: Plan) -> Iterator[Complaint]:
    """A relative path that stays in the plan's folder, on every system."""
    file = plan.data.file
    # The Windows flavour understands both kinds of slash, drives and network shares.
    path = PureWindowsPath(file)
    if path.anchor or file.startswith("~") or re.match(r"\w+://", file):
        what = "is not a path relative to the plan; a data file stands in the plan's own folder"
        yield Complaint("data.file", what, "data_file")
    elif ".." in path.parts:
        what = "leaves the plan's folder; a data file stands inside it, so that both travel together"
        yield Complaint("data.file", what, "data_file")


def _data_marks(plan: Plan) -> Iterator[Complaint]:
    """Cells, decimals and quotes need marks that can be told apart."""
    separator = plan.data.separator
    if len(separator) != 1 or separator in '"\r\n' or separator.isalnum():
        yield Complaint(
            "data.separator", f"is {separator!r}; it must be one sign, such as , or ;", "separator"
        )
    elif separator == plan.data.decimal:
        what = f"is {separator!r}, which is also the decimal mark; set separator or decimal"
        yield Complaint("data.separator", what, "separator")


def _outcome_used(plan: Plan) -> Iterator[Complaint]:
    """The outcome has no second part to play."""
    outcome = plan.outcome.column
    roles: list[tuple[str, str | None, str]] = [("data.row_label", plan.data.row_label, "labels the rows")]
    check = plan.assumptions.independence
    if check != "skip":
        roles.append(("assumptions.independence.in_order_of", check.in_order_of, "orders the rows"))
    if isinstance(plan.errors, ClusterBy):
        roles.append(("errors.cluster_by", plan.errors.cluster_by, "names the clusters"))
    roles.append(("rehearsal.leave_out", plan.rehearsal.leave_out, "names the groups"))
    for place, column, part in roles:
        if column == outcome:
            yield Complaint(place, f"is the outcome {outcome!r}; another column {part}", "outcome_used")
    made = _made_from_outcome(plan)
    for number, line in enumerate(plan.eligibility):
        if line.column == outcome or line.column in made:
            what = (
                f"chooses rows by the outcome {outcome!r}, which is not to be looked at; "
                "outcome.range says which values are possible"
            )
            yield Complaint(f"eligibility[{number}].column", what, "outcome_used")


def _predictors(plan: Plan) -> Iterator[Complaint]:
    """Each predictor once, and none of them the outcome or made from it."""
    outcome, made = plan.outcome.column, _made_from_outcome(plan)
    for number, predictor in enumerate(plan.predictors):
        place, column = f"predictors[{number}].column", predictor.column
        if column == outcome:
            yield Complaint(
                place, f"is the outcome {outcome!r}; an outcome cannot predict itself", "outcome_used"
            )
        elif column in made:
            yield Complaint(place, f"is derived from the outcome {outcome!r}", "outcome_used")
        if predictor.kind == "category" and column == plan.data.row_label:
            yield Complaint(
                place, "is the row label, so that every row would be a level of its own", "row_label"
            )
    for number, first, column in repeats([predictor.column for predictor in plan.predictors]):
        what = f"names {column!r} a second time (first as predictors[{first}])"
        yield Complaint(f"predictors[{number}].column", what, "repeated")


def _kinds(plan: Plan) -> Iterator[Complaint]:
    """Numbers have ranges and units, categories have levels and a baseline."""
    derived = {line.column for line in plan.derive}
    for number, predictor in enumerate(plan.predictors):
        place = f"predictors[{number}]"
        if predictor.kind == "number":
            for key, value in (("levels", predictor.levels), ("baseline", predictor.baseline)):
                if value:
                    what = f"belongs to a category, but {predictor.column!r} is a number; add kind: category"
                    yield Complaint(f"{place}.{key}", what, "kind")
            continue
        if predictor.column in derived:
            yield Complaint(f"{place}.kind", "is category, but a derived column holds numbers", "kind")
        if predictor.range is not None:
            what = f"belongs to a number, but {predictor.column!r} is a category"
            yield Complaint(f"{place}.range", what, "kind")
        yield from _levels(plan, predictor, place)


def _levels(plan: Plan, predictor: Predictor, place: str) -> Iterator[Complaint]:
    """Two or more different levels, none of them a missing code, the baseline among them."""
    levels = predictor.levels
    if not levels:
        what = f"is missing; the category {predictor.column!r} needs its levels, such as [low, high]"
        yield Complaint(f"{place}.levels", what, "levels")
        return
    if len(levels) == 1:
        yield Complaint(
            f"{place}.levels", f"has one level, {levels[0]!r}; a category needs two or more", "levels"
        )
    yield from repeated(f"{place}.levels", levels)
    for number, level in enumerate(levels):
        if level in plan.data.missing_codes:
            what = f"is {level!r}, which data.missing_codes reads as missing"
            yield Complaint(f"{place}.levels[{number}]", what, "levels")
    if predictor.baseline not in levels:
        baseline = str(predictor.baseline)
        what = f"is {baseline!r}, which is not among the levels {', '.join(levels)}{near(baseline, levels)}"
        yield Complaint(f"{place}.baseline", what, "baseline")


def _eligibility(plan: Plan) -> Iterator[Complaint]:
    """No line twice, and none that asks for a level that is not declared."""
    categories = {p.column: p for p in plan.predictors if p.kind == "category" and p.levels}
    for number, line in enumerate(plan.eligibility):
        name, value = line.condition
        place = f"eligibility[{number}].{name}"
        if line.column in categories and name in ("is", "one_of"):
            yield from _level_asked_for(line, categories[line.column], place)
        if isinstance(value, tuple) and len(set(value)) < len(value):
            yield Complaint(place, "names a value a second time", "repeated")
    asked = [(line.column, line.condition) for line in plan.eligibility]
    for number, first, _ in repeats(asked):
        yield Complaint(f"eligibility[{number}]", f"asks the same as eligibility[{first}]", "repeated")


def _level_asked_for(line: Eligibility, predictor: Predictor, place: str) -> Iterator[Complaint]:
    """A value that is asked for must be among the declared levels."""
    _, value = line.condition
    for one in value if isinstance(value, tuple) else (value,):
        text = one if isinstance(one, str) else number_text(one)
        if not any(_same_cell(one, level) for level in predictor.levels):
            hint = near(text, predictor.levels)
            what = f"asks for {text!r}, which is not among the levels of {line.column!r}{hint}"
            yield Complaint(place, what, "levels")


def _same_cell(value: float | str, level: str) -> bool:
    """Whether a level is the value asked for; a number is asked for as a number."""
    if isinstance(value, str):
        return value == level
    try:
        return float(level) == value
    except ValueError:
        return False


def _derive(plan: Plan) -> Iterator[Complaint]:
    """New names, made from columns that are there by then and hold numbers."""
    categories = {p.column for p in plan.predictors if p.kind == "category"}
    # Of a name that is made twice the first line counts.
    made = {line.column: number for number, line in reversed(list(enumerate(plan.derive)))}
    for number, line in enumerate(plan.derive):
        place = f"derive[{number}]"
        uses = names_in(line.formula)
        if made[line.column] != number:
            what = f"makes {line.column!r} a second time (first as derive[{made[line.column]}])"
            yield Complaint(f"{place}.column", what, "repeated")
        if line.column == plan.data.row_label:
            yield Complaint(f"{place}.column", "is the row label, which stands in the file", "derive")
        if not uses:
            yield Complaint(f"{place}.from", "names no column, so that every row would be the same", "derive")
        for name in uses:
            if name == line.column:
                yield Complaint(
                    f"{place}.from", f"uses {name!r} to make {name!r}; choose a new name", "derive"
                )
            elif made.get(name, -1) > number:
                what = f"uses {name!r}, which is made only later (derive[{made[name]}]); put that line first"
                yield Complaint(f"{place}.from", what, "derive")
            elif name in categories:
                yield Complaint(f"{place}.from", f"computes with {name!r}, which is a category", "kind")


def _made_from_outcome(plan: Plan) -> frozenset[str]:
    """Derived columns into which the outcome goes, straight or through others."""
    outcome = plan.outcome.column
    made: set[str] = set()
    for line in plan.derive:
        if line.column != outcome and any(name == outcome or name in made for name in names_in(line.formula)):
            made.add(line.column)
    return frozenset(made)


CHECKS: tuple[Callable[[Plan], Iterator[Complaint]], ...] = (
    _data_file,
    _data_marks,
    _eligibility,
    _derive,
    _outcome_used,
    _predictors,
    _kinds,
)
