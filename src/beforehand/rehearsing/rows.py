"""Tables made of the rows of another: samples, halves, what folds leave."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from beforehand.plan import Plan
from beforehand.running import order_column
from beforehand.table import Column, Table

Positions = NDArray[np.int64]


def table_of_rows(table: Table, rows: Positions) -> Table:
    """The table of some rows, in the order given; a row may come more than once."""
    columns = {name: replace(column, values=column.values[rows]) for name, column in table.columns.items()}
    return replace(table, columns=columns, labels=table.labels[rows], n_rows=len(rows))


def clusters_of(plan: Plan, table: Table) -> NDArray[Any] | None:
    """Number of each row's cluster, where the plan's standard errors are clustered; from 0 without a gap."""
    column = getattr(plan.errors, "cluster_by", None)
    if column is None:
        return None
    _, codes = np.unique(table.columns[column].values, return_inverse=True)
    return np.asarray(codes, dtype=np.int64)


def sample_with_replacement(plan: Plan, table: Table, rng: np.random.Generator) -> Table:
    """As many rows as the table has, drawn with replacement; whole clusters where errors are clustered.

    A cluster that is drawn twice counts as two, as its rows are as far from their copies as from any
    other cluster's (Davison & Hinkley 1997, ch. 3.8).
    """
    codes = clusters_of(plan, table)
    if codes is None:
        drawn = table_of_rows(table, np.sort(rng.integers(0, table.n_rows, table.n_rows)))
        return _without_order(plan, drawn, rng)
    members = _members(codes)
    chosen = rng.integers(0, len(members), len(members))
    drawn = table_of_rows(table, np.concatenate([members[cluster] for cluster in chosen.tolist()]))
    drawn = _without_order(plan, drawn, rng)
    name = plan.errors.cluster_by  # type: ignore[union-attr]
    if name in {predictor.column for predictor in plan.predictors}:
        return drawn
    again = np.repeat(np.arange(float(len(chosen))), [len(members[cluster]) for cluster in chosen.tolist()])
    return _with(drawn, Column(name=name, kind="number", values=again))


def _without_order(plan: Plan, drawn: Table, rng: np.random.Generator) -> Table:
    """The rows in an order of no meaning: in the old one copies of a row would follow each other."""
    name = order_column(plan)
    if name is None or name in {predictor.column for predictor in plan.predictors}:
        return drawn
    order = rng.permutation(drawn.n_rows).astype(np.float64)
    return _with(drawn, Column(name=name, kind="number", values=order))


def _with(table: Table, column: Column) -> Table:
    """The table with another column of this name."""
    return replace(table, columns={**table.columns, column.name: column})


def half(plan: Plan, table: Table, rng: np.random.Generator) -> Positions:
    """Half of the rows, drawn without replacement, ascending; of whole clusters where there are any."""
    codes = clusters_of(plan, table)
    if codes is None:
        return np.sort(rng.permutation(table.n_rows)[: table.n_rows // 2])
    clusters = int(codes.max()) + 1
    chosen = rng.permutation(clusters)[: max(1, clusters // 2)]
    return np.flatnonzero(np.isin(codes, chosen)).astype(np.int64)


def _members(codes: NDArray[np.int64]) -> list[Positions]:
    """Rows of each cluster, ascending."""
    order = np.argsort(codes, kind="stable")
    return np.split(order, np.cumsum(np.bincount(codes))[:-1])
