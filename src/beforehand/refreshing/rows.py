"""Which rows of a refreshed table are new, gone, revised or the same."""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping
from dataclasses import dataclass

from beforehand.table import Table


@dataclass(frozen=True, slots=True, kw_only=True)
class RowChanges:
    """Rows of two tables, matched.

    Rows without labels of their own are matched by content, so that none of them counts as revised;
    their labels are their numbers, in the new table or, for those that are gone, in the old one.

    Attributes
    ----------
    new, gone, revised, same : tuple of str
        Labels, in canonical order.
    matched_by : str
        ``label`` or ``content``.
    """

    new: tuple[str, ...]
    gone: tuple[str, ...]
    revised: tuple[str, ...]
    same: tuple[str, ...]
    matched_by: str


def row_changes(old: Table, new: Table) -> RowChanges:
    """Match the rows of two tables under one plan.

    Parameters
    ----------
    old, new : Table
    """
    before, after = contents(old), contents(new)
    if old.labelled and new.labelled:
        first = dict(zip(map(str, old.labels.tolist()), before, strict=True))
        second = dict(zip(map(str, new.labels.tolist()), after, strict=True))
        both = [label for label in second if label in first]
        return RowChanges(
            new=tuple(label for label in second if label not in first),
            gone=tuple(label for label in first if label not in second),
            revised=tuple(label for label in both if first[label] != second[label]),
            same=tuple(label for label in both if first[label] == second[label]),
            matched_by="label",
        )
    first_of, second_of = identities(old), identities(new)
    return RowChanges(
        new=tuple(label for key, label in second_of.items() if key not in first_of),
        gone=tuple(label for key, label in first_of.items() if key not in second_of),
        revised=(),
        same=tuple(label for key, label in second_of.items() if key in first_of),
        matched_by="content",
    )


def identities(table: Table) -> Mapping[str, str]:
    """What a row is known by in both tables, to its label: the label itself, or its content."""
    labels = [str(label) for label in table.labels.tolist()]
    if table.labelled:
        return dict(zip(labels, labels, strict=True))
    seen: Counter[tuple[object, ...]] = Counter()
    found: dict[str, str] = {}
    for label, content in zip(labels, contents(table), strict=True):
        seen[content] += 1
        # Equal rows are interchangeable, so that the first of one table is the first of the other.
        found[f"{content!r} {seen[content]}"] = label
    return found


def contents(table: Table) -> list[tuple[object, ...]]:
    """The values of each row, columns in the order of their names; a missing cell is None."""
    columns: list[list[object]] = []
    for name in sorted(table.columns):
        column = table.columns[name]
        if column.kind == "number":
            columns.append([None if value != value else value for value in column.values.tolist()])
        else:
            columns.append(
                [None if code < 0 else column.levels[int(code)] for code in column.values.tolist()]
            )
    return list(zip(*columns, strict=True)) if columns else [()] * table.n_rows
