"""The data dictionary of a bundle: what the columns are, drawn from plan and table, without a row."""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping
from typing import Any

import numpy as np

from beforehand.plan import Plan
from beforehand.plan.yaml_text import yaml_text
from beforehand.table import Table
from beforehand.table.wanted import wanted_of

# The block of the plan that names a column, before the first dot or bracket of its place.
_USE = re.compile(r"[.\[]")

HEAD = "# Drawn from the plan and the table; it holds no row. Ranges are those that the plan declares.\n"


def dictionary_text(plan: Plan, table: Table | None, *, fewest: int = 1) -> str:
    """The dictionary as YAML.

    Parameters
    ----------
    plan : Plan
    table : Table or None
        None where the table is not at hand: then nothing is counted.
    fewest : int
        Levels that only the table shows are told when at least so many rows have them.
    """
    described: dict[str, Any] = {"file": plan.data.file}
    if table is not None:
        described |= {"rows": table.ledger[0].rows, "eligible": table.n_rows}
    if plan.data.row_label is not None:
        described["row_label"] = plan.data.row_label
    columns = [
        {key: value for key, value in column.items() if value is not None}
        for column in _columns(plan, table, fewest)
    ]
    return HEAD + yaml_text({"dictionary": 1, "title": plan.title, "table": described, "columns": columns})


def _columns(plan: Plan, table: Table | None, fewest: int) -> Iterator[Mapping[str, Any]]:
    """The outcome, the predictors, and what else is read or made."""
    formulas = {line.column: line.from_ for line in plan.derive}
    outcome = plan.outcome
    yield {
        "column": outcome.column, "use": "outcome", "kind": "number", "unit": outcome.unit,
        "from": formulas.get(outcome.column), "range": outcome.range, **_counted(outcome.column, table),
    }  # fmt: skip
    told = {outcome.column}
    for predictor in plan.predictors:
        name = predictor.column
        told.add(name)
        yield {
            "column": name, "use": "predictor", "kind": predictor.kind, "unit": predictor.unit,
            "from": formulas.get(name), "range": predictor.range, "baseline": predictor.baseline,
            "levels": _levels(name, predictor.kind, predictor.levels, table, fewest),
            **_counted(name, table),
        }  # fmt: skip
    for line in plan.derive:
        if line.column not in told:
            yield {
                "column": line.column, "use": "derive", "kind": "number", "unit": line.unit,
                "from": line.from_, **_counted(line.column, table),
            }  # fmt: skip
        told.add(line.column)
    for name, want in wanted_of(plan).items():
        if name not in told:
            use = "row_label" if name == plan.data.row_label else _USE.split(want.place)[0]
            yield {"column": name, "use": use, "kind": want.kind, **_counted(name, table)}


def _levels(
    name: str, kind: str, declared: tuple[str, ...] | None, table: Table | None, fewest: int
) -> list[str] | None:
    """Levels of a category: as declared, else as seen in enough rows."""
    if kind != "category":
        return None
    if declared or table is None:
        return list(declared) if declared else None
    column = table.columns[name]
    return [level for code, level in enumerate(column.levels) if int((column.values == code).sum()) >= fewest]


def _counted(name: str, table: Table | None) -> dict[str, int]:
    """How many eligible rows have no value."""
    if table is None or name not in table.columns:
        return {}
    column = table.columns[name]
    gone = np.isnan(column.values) if column.kind == "number" else column.values < 0
    return {"missing": int(gone.sum())}
