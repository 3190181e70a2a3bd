"""A table under a plan's contract: typed columns, labelled rows, in canonical order."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

Kind = Literal["number", "category", "text"]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Column:
    """One column of a table.

    Attributes
    ----------
    name : str
    kind : str
        ``number``, ``category`` (a predictor of levels) or ``text``.
    values : array, shape (n_rows,)
        Numbers as float64 with NaN for missing; codes of ``levels`` as int32 with -1 for missing.
    levels : tuple of str
        Levels in declared order, or as seen, sorted; empty for a number.
    """

    name: str
    kind: Kind
    values: NDArray[Any]
    levels: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class Stage:
    """How many rows are left at one stage of the intake, and the plan's reason."""

    name: str
    rows: int
    because: str | None = None


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Table:
    """The eligible rows of a file, typed, in an order that does not depend on the file's.

    Attributes
    ----------
    columns : mapping of name to Column
        Only what the plan names.
    labels : array of str, shape (n_rows,)
        Labels in canonical order; ``1`` to ``n_rows`` where the plan names no label column.
    labelled : bool
    n_rows : int
    fingerprint : str
        Digest of the columns in use as typed, all rows read, in canonical order.
    file : str
        The file as the plan names it.
    ledger : tuple of Stage
        ``read``, then each eligibility line, then ``with an outcome``.
    cells_missing_by_derive, out_of_range : mapping of column to count
        Cells that a formula could not compute, and cells outside a declared range taken as missing.
    """

    columns: Mapping[str, Column]
    labels: NDArray[Any]
    labelled: bool
    n_rows: int
    fingerprint: str
    file: str
    ledger: tuple[Stage, ...]
    cells_missing_by_derive: Mapping[str, int]
    out_of_range: Mapping[str, int]


def ranks_of(table: Table, column: str) -> NDArray[np.int64]:
    """Rank of each row in the order of a column, shape (n_rows,); equal values rank equally.

    A text column whose levels are all numbers is ordered as numbers; ISO dates order as text.
    Missing values come last.
    """
    found = table.columns[column]
    if found.kind == "number":
        _, ranks = np.unique(found.values, return_inverse=True)
        return np.asarray(ranks, dtype=np.int64)
    try:
        order = np.argsort([float(level) for level in found.levels], kind="stable")
    except ValueError:
        order = np.argsort(np.array(found.levels, dtype=object), kind="stable")
    place = np.empty(len(order) + 1, dtype=np.int64)
    place[order] = np.arange(len(order))
    place[-1] = len(order)
    ranked: NDArray[np.int64] = place[found.values]
    return ranked
