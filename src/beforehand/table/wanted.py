"""Which columns of a file a plan asks for, and as what; everything else is never read."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Literal

from beforehand.plan import Plan
from beforehand.plan.arithmetic import names_in
from beforehand.plan.formula import parse_formula


@dataclass(frozen=True, slots=True, kw_only=True)
class Wanted:
    """A column of the file and its kind.

    ``place`` is where the plan names it, for faults about the plan's own words.
    """

    name: str
    kind: Literal["number", "text"]
    place: str


def wanted_of(plan: Plan) -> Mapping[str, Wanted]:
    """Columns to read by name; the first place that declares a kind decides it."""
    found: dict[str, Wanted] = {}
    derived = {line.column for line in plan.derive}

    def want(name: str, kind: Literal["number", "text"], place: str) -> None:
        if name not in derived and name not in found:
            found[name] = Wanted(name=name, kind=kind, place=place)

    want(plan.outcome.column, "number", "outcome.column")
    for number, predictor in enumerate(plan.predictors):
        kind: Literal["number", "text"] = "number" if predictor.kind == "number" else "text"
        want(predictor.column, kind, f"predictors[{number}].column")
    for number, line in enumerate(plan.derive):
        for name in names_in(parse_formula(line.from_)):
            want(name, "number", f"derive[{number}].from")
    for number, eligible in enumerate(plan.eligibility):
        _, value = eligible.condition
        values = value if isinstance(value, tuple) else (value,)
        numeric = all(isinstance(one, float | int) for one in values)
        want(eligible.column, "number" if numeric else "text", f"eligibility[{number}].column")
    independence = plan.assumptions.independence
    if independence != "skip" and independence.in_order_of is not None:
        want(independence.in_order_of, "text", "assumptions.independence.in_order_of")
    cluster = getattr(plan.errors, "cluster_by", None)
    if cluster is not None:
        want(cluster, "text", "errors.cluster_by")
    if plan.rehearsal.leave_out is not None:
        want(plan.rehearsal.leave_out, "text", "rehearsal.leave_out")
    if plan.data.row_label is not None:
        want(plan.data.row_label, "text", "data.row_label")
    return found


def group_column(plan: Plan) -> str | None:
    """The column whose groups of rows are left out one at a time; None where folds are drawn."""
    return plan.rehearsal.leave_out or getattr(plan.errors, "cluster_by", None)
