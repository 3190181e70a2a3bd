"""From columns as read to a table: canonical order, fingerprint, population, derived columns, ranges."""

from __future__ import annotations

import hashlib
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from beforehand.faults import DataError, Fault, did_you_mean
from beforehand.plan import Plan
from beforehand.plan.arithmetic import names_in
from beforehand.plan.formula import evaluate, parse_formula
from beforehand.plan.variables import Eligibility, Predictor
from beforehand.table.cells import NAMED, fault, named
from beforehand.table.columns import Column, Stage, Table

Mask = NDArray[np.bool_]
Raw = Mapping[str, NDArray[Any]]


@dataclass(frozen=True, slots=True, kw_only=True)
class AsRead:
    """Wanted columns of a file in file order: float64 numbers, or texts with None for missing.

    ``lines`` gives the file's line of each row, for faults; empty where there are none.
    """

    file: str
    columns: Raw
    n_rows: int
    lines: Sequence[int] = ()

    def line(self, row: int) -> int | None:
        """Line of the file on which a row begins."""
        return self.lines[row] if len(self.lines) else None


def row_namer(read: AsRead, label_column: str | None) -> Callable[[int], str]:
    """How a fault names a row: by its label, else by its line or place."""
    labels = read.columns.get(label_column) if label_column is not None else None

    def name(row: int) -> str:
        if labels is not None and labels[row] is not None:
            return str(labels[row])
        line = read.line(row)
        return f"{row + 1}" if line is None else f"on line {line}"

    return name


def prepared(plan: Plan, read: AsRead) -> Table:
    """The table of a plan from its columns as read.

    Raises
    ------
    DataError
        With every fault: labels, levels, ranges, eligibility that leaves no row.
    """
    name_row = row_namer(read, plan.data.row_label)
    faults = list(label_faults(plan, read, name_row))
    if faults:
        raise DataError(faults)
    order = canonical_order(plan, read)
    fingerprint, ordered = _fingerprint(read, order)
    eligible, stages = _eligible(plan, read)
    everyone = bool(eligible.all())
    index = order if everyone else order[eligible[order]]
    if not len(index):
        raise DataError([fault(read.file, None, "eligibility", "no row is eligible", "no_rows")])
    columns: dict[str, Column] = {}
    declared = {p.column: p for p in plan.predictors if p.kind == "category"}
    for name, values in read.columns.items():
        if name == plan.data.row_label and not _is_used(plan, name):
            continue
        chosen = ordered[name] if everyone else values[index]
        columns[name] = _column(name, chosen, index, declared.get(name), read, name_row, faults)
    missing_by_derive = _derive(plan, columns)
    out_of_range = _ranges(plan, columns, index, read, name_row, faults)
    if faults:
        raise DataError(faults)
    labelled = plan.data.row_label is not None
    labels: NDArray[Any] = (
        read.columns[plan.data.row_label][index]
        if plan.data.row_label is not None
        else np.arange(1, len(index) + 1)
    )
    outcome = columns[plan.outcome.column].values
    stages.append(Stage(name="with an outcome", rows=int((~np.isnan(outcome)).sum())))
    return Table(
        columns=columns,
        labels=labels,
        labelled=labelled,
        n_rows=len(index),
        fingerprint=fingerprint,
        file=plan.data.file,
        ledger=tuple(stages),
        cells_missing_by_derive=missing_by_derive,
        out_of_range=out_of_range,
    )


def _is_used(plan: Plan, name: str) -> bool:
    """Whether a column is more than the row label."""
    cluster = getattr(plan.errors, "cluster_by", None)
    independence = plan.assumptions.independence
    order = None if independence == "skip" else independence.in_order_of
    groups = plan.rehearsal.leave_out
    return name in (cluster, order, groups) or any(line.column == name for line in plan.eligibility)


def label_faults(plan: Plan, read: AsRead, name_row: Callable[[int], str]) -> list[Fault]:
    """Labels that are missing or stand twice."""
    column = plan.data.row_label
    if column is None:
        return []
    labels = read.columns[column].tolist()
    faults: list[Fault] = []
    empty = [row for row, label in enumerate(labels) if label is None]
    if empty:
        where = named([f"on line {line}" if (line := read.line(row)) else str(row + 1) for row in empty])
        what = (
            f"the row label is missing (rows {where})"
            if len(empty) > 1
            else f"the row label is missing (row {where})"
        )
        faults.append(fault(read.file, read.line(empty[0]), column, what, "missing_label"))
    if len(set(labels)) < len(labels) - max(0, len(empty) - 1):
        seen: dict[str, int] = {}
        twice: dict[str, int] = {}
        for row, label in enumerate(labels):
            if label is not None and label in seen:
                twice.setdefault(label, row)
            elif label is not None:
                seen[label] = row
        for label, row in list(twice.items())[:NAMED]:
            first = read.line(seen[label])
            before = "" if first is None else f", first on line {first}"
            what = f"the row label {label!r} stands twice{before}"
            faults.append(fault(read.file, read.line(row), column, what, "repeated_label"))
        if len(twice) > NAMED:
            what = f"{len(twice) - NAMED:,} more row labels stand twice"
            faults.append(fault(read.file, None, column, what, "repeated_label"))
    return faults


def canonical_order(plan: Plan, read: AsRead) -> NDArray[np.int64]:
    """Places of rows in an order that does not depend on the file's.

    By label where there is one. Else by content, column after column in the order of their names,
    until no two rows are equal; rows that are equal throughout are interchangeable.
    """
    if plan.data.row_label is not None:
        labels = read.columns[plan.data.row_label]
        return np.argsort(labels.astype(str), kind="stable").astype(np.int64)
    order = np.arange(read.n_rows, dtype=np.int64)
    # Where each place's group of equal rows begins; only groups of two or more are sorted further.
    start = np.zeros(read.n_rows, dtype=np.int64)
    tied = order.copy()
    for name in sorted(read.columns):
        if not len(tied):
            break
        key = _sortable(read.columns[name])[order[tied]]
        within = np.lexsort((key, start[tied])) if start[tied].any() else np.argsort(key, kind="stable")
        order[tied] = order[tied][within]
        key, group = key[within], start[tied]
        new = np.concatenate([[True], (key[1:] != key[:-1]) | (group[1:] != group[:-1])])
        start[tied] = np.maximum.accumulate(np.where(new, tied, 0))
        alone = new & np.concatenate([new[1:], [True]])
        tied = tied[~alone]
    return order


def _sortable(values: NDArray[Any]) -> NDArray[Any]:
    """A column as numbers that sort, missing values first."""
    if values.dtype == object:
        texts = np.array(["" if text is None else "\x01" + text for text in values.tolist()])
        return np.asarray(np.unique(texts, return_inverse=True)[1], dtype=np.int64)
    return np.where(np.isnan(values), -np.inf, values)


def _fingerprint(read: AsRead, order: NDArray[np.int64]) -> tuple[str, dict[str, NDArray[Any]]]:
    """Digest of the columns as typed, so that 1.0 and 1.00, or another separator, are the same.

    With it come the columns in the order of which it was taken.
    """
    ordered: dict[str, NDArray[Any]] = {}
    digest = hashlib.sha256(b"beforehand table 1\n")
    straight = bool((np.diff(order) == 1).all())
    for name in sorted(read.columns):
        values = ordered[name] = read.columns[name] if straight else read.columns[name][order]
        if values.dtype == object:
            digest.update(f"text {len(name.encode())} {name}\n".encode())
            for text in values.tolist():
                cell = b"" if text is None else text.encode()
                digest.update(b"-\n" if text is None else b"%d\n%s" % (len(cell), cell))
        else:
            digest.update(f"number {len(name.encode())} {name}\n".encode())
            # One pattern of bits for every missing number.
            gaps = np.isnan(values)
            plain = np.where(gaps, np.nan, values) if gaps.any() else values
            digest.update(np.ascontiguousarray(plain, dtype="<f8").data)
    return f"sha256:{digest.hexdigest()}", ordered


def _eligible(plan: Plan, read: AsRead) -> tuple[Mask, list[Stage]]:
    """Which rows are the population, line by line of the plan, in file order."""
    eligible = np.ones(read.n_rows, dtype=bool)
    stages = [Stage(name="read", rows=read.n_rows)]
    for line in plan.eligibility:
        eligible &= meets(line, read.columns[line.column])
        name, value = line.condition
        shown = ", ".join(map(str, value)) if isinstance(value, tuple) else str(value)
        stages.append(
            Stage(
                name=f"{line.column} {name.replace('_', ' ')} {shown}",
                rows=int(eligible.sum()),
                because=line.because,
            )
        )
    return eligible, stages


def meets(line: Eligibility, values: NDArray[Any]) -> Mask:
    """Rows that meet one condition; a missing cell meets none."""
    name, wanted = line.condition
    if values.dtype == object:
        present = np.array([text is not None for text in values.tolist()], dtype=bool)
        filled = np.where(present, values, "").astype(str)
        compare: Any = str(wanted) if not isinstance(wanted, tuple) else tuple(map(str, wanted))
    else:
        present, filled = ~np.isnan(values), values
        compare = wanted
    tests: dict[str, Callable[[], Mask]] = {
        "is": lambda: filled == compare,
        "is_not": lambda: filled != compare,
        "one_of": lambda: np.isin(filled, list(compare)),
        "at_least": lambda: filled >= compare,
        "at_most": lambda: filled <= compare,
        "above": lambda: filled > compare,
        "below": lambda: filled < compare,
    }
    return present & tests[name]()


def _column(
    name: str,
    chosen: NDArray[Any],
    index: NDArray[np.int64],
    predictor: Predictor | None,
    read: AsRead,
    name_row: Callable[[int], str],
    faults: list[Fault],
) -> Column:
    """One column over the eligible rows: numbers, or codes of its levels."""
    if chosen.dtype != object:
        return Column(name=name, kind="number", values=chosen)
    texts = chosen.tolist()
    seen = sorted({text for text in texts if text is not None})
    levels = tuple(seen)
    if predictor is not None and predictor.levels:
        levels = predictor.levels
        unknown = [level for level in seen if level not in levels]
        for level in unknown[:NAMED]:
            rows = sorted(int(index[place]) for place, text in enumerate(texts) if text == level)
            where = named([name_row(row) for row in rows])
            what = (
                f"{level!r} is not a declared level{did_you_mean(level, levels)} "
                f"({'row' if len(rows) == 1 else 'rows'} {where})"
            )
            faults.append(fault(read.file, read.line(rows[0]), name, what, "unknown_level"))
        if len(unknown) > NAMED:
            what = f"{len(unknown) - NAMED:,} more levels are not declared"
            faults.append(fault(read.file, None, name, what, "unknown_level"))
    code = {level: place for place, level in enumerate(levels)}
    codes = np.array([-1 if text is None else code.get(text, -1) for text in texts], dtype=np.int32)
    return Column(name=name, kind="text" if predictor is None else "category", values=codes, levels=levels)


def _derive(plan: Plan, columns: dict[str, Column]) -> dict[str, int]:
    """Derived columns in plan order, and how many cells of each could not be computed."""
    counts: dict[str, int] = {}
    for line in plan.derive:
        expression = parse_formula(line.from_)
        used = {name: columns[name].values for name in names_in(expression)}
        values = np.asarray(evaluate(expression, used), dtype=np.float64)
        n_rows = len(columns[plan.outcome.column].values) if plan.outcome.column in columns else 0
        if values.ndim == 0:
            rows = n_rows or len(next(iter(columns.values())).values)
            values = np.full(rows, float(values))
        present = np.ones(len(values), dtype=bool)
        for one in used.values():
            present &= ~np.isnan(one)
        lost = int((np.isnan(values) & present).sum())
        if lost:
            counts[line.column] = lost
        columns[line.column] = Column(name=line.column, kind="number", values=values + 0.0)
    return counts


def _bound(value: float | None) -> str:
    """One end of a declared range; an open end is empty."""
    return "" if value is None else f"{value:.15g}"


def _ranges(
    plan: Plan,
    columns: dict[str, Column],
    index: NDArray[np.int64],
    read: AsRead,
    name_row: Callable[[int], str],
    faults: list[Fault],
) -> dict[str, int]:
    """Values outside a declared range: a fault, or missing and counted, as the plan says."""
    declared = [(plan.outcome.column, plan.outcome.range), *((p.column, p.range) for p in plan.predictors)]
    counts: dict[str, int] = {}
    for name, limits in declared:
        if limits is None or columns[name].kind != "number":
            continue
        low, high = (-np.inf if limits[0] is None else limits[0], np.inf if limits[1] is None else limits[1])
        values = columns[name].values
        with np.errstate(invalid="ignore"):
            outside = (values < low) | (values > high)
        if not outside.any():
            continue
        if plan.missing_data.out_of_range == "missing":
            counts[name] = int(outside.sum())
            columns[name] = Column(name=name, kind="number", values=np.where(outside, np.nan, values))
            continue
        rows = sorted(int(index[place]) for place in np.flatnonzero(outside))
        where = named([name_row(row) for row in rows])
        place = int(np.flatnonzero(index == rows[0])[0])
        what = (
            f"{values[place]:.15g} is outside the declared range "
            f"[{_bound(limits[0])}, {_bound(limits[1])}] "
            f"({'row' if len(rows) == 1 else 'rows'} {where})"
        )
        faults.append(fault(read.file, read.line(rows[0]), name, what, "out_of_range"))
    return counts
