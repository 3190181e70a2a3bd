"""What was removed and why, and what a rule kept: every line names its ruling."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING

from beforehand.screen.digits import count, listed
from beforehand.screen.layout import INDENT, wrapped

if TYPE_CHECKING:
    from beforehand.lock import Lock, RowRemoved, RulingRecord

# One screen has room for so many lines of a kind; the record has all of them.
MOST_PREDICTORS = 15
MOST_ROWS_TOLD = 3
MOST_LABELS = 8
MOST_KEPT = 8


def removal_lines(lock: Lock, width: int) -> tuple[str, ...]:
    """Predictors that left in the order of their rulings, then rows, grouped."""
    rulings = {ruling.id: ruling for ruling in lock.rulings}
    order = {ruling.id: place for place, ruling in enumerate(lock.rulings)}
    gone: dict[str, list[str]] = {}
    for name, fate in lock.predictors.items():
        if fate.verdict == "removed":
            gone.setdefault(fate.ruling or "", []).append(name)
    numbers = sorted(gone, key=lambda number: order.get(number, len(order)))
    lines: list[str] = []
    for number in numbers[:MOST_PREDICTORS]:
        lines += ruled(number, _about(gone[number], lock, rulings.get(number)), width)
    left = [name for number in numbers[MOST_PREDICTORS:] for name in gone[number]]
    if left:
        lines += wrapped(f"{count(len(left), 'more predictor')}: {listed(left, MOST_LABELS)}.", width)
    return (*lines, *_row_lines(lock.rows_removed, rulings, width))


def _about(names: Sequence[str], lock: Lock, ruling: RulingRecord | None) -> str:
    """The reason of a removal; what leaves by a ruling about something else is named."""
    if ruling is None:
        return " ".join(lock.predictors[name].says for name in names)
    others = [name for name in names if name != ruling.subject]
    says = ruling.says if others else lock.predictors[names[0]].says
    return f"{says} Out by it: {listed(others, MOST_LABELS)}." if others else says


def ruled(ruling: str, says: str, width: int) -> tuple[str, ...]:
    """A sentence behind the number of its ruling."""
    return wrapped(says, width, first=f"{INDENT}{ruling:<4}{INDENT}")


def _row_lines(
    removed: Sequence[RowRemoved], rulings: Mapping[str, RulingRecord], width: int
) -> tuple[str, ...]:
    """Rows that left: few one by one, many as a group with their labels."""
    by_ruling: dict[str, list[str]] = {}
    for entry in removed:
        by_ruling.setdefault(entry.ruling, []).append(entry.row)
    alone: dict[str, list[tuple[str, str]]] = {}
    lines: list[str] = []
    for number, labels in by_ruling.items():
        ruling = rulings.get(number)
        if ruling is not None and ruling.subject == labels[0] and len(labels) == 1:
            alone.setdefault(ruling.step, []).append((number, labels[0]))
            continue
        says = ruling.says if ruling is not None else f"{count(len(labels), 'row')} removed."
        lines += ruled(number, f"{says} {_named(labels, _told(ruling, len(labels)))}", width)
    for step, pairs in alone.items():
        if len(pairs) <= MOST_ROWS_TOLD:
            for number, _ in pairs:
                lines += ruled(number, rulings[number].says, width)
        else:
            named = [f"{label} ({number})" for number, label in pairs]
            text = f"{len(pairs)} rows leave by {step.replace('_', ' ')}: {listed(named, MOST_LABELS)}."
            lines += ruled(pairs[0][0], text, width)
    return tuple(lines)


def _told(ruling: RulingRecord | None, known: int) -> int:
    """How many rows a ruling removed, which may be more than are listed."""
    rows = ruling.evidence.get("rows") if ruling is not None else None
    return int(rows) if isinstance(rows, int | float) else known


def _named(labels: Sequence[str], total: int) -> str:
    """The labels of removed rows, few of them."""
    shown = list(labels[:MOST_LABELS])
    left = max(total, len(labels)) - len(shown)
    return f"Rows: {', '.join(shown)} and {left:,} more." if left > 0 else f"Rows: {listed(shown)}."


def kept_lines(lock: Lock, width: int) -> tuple[str, ...]:
    """Rulings in which a keep rule or a product prevented a removal, once a rule and predictor."""
    last: dict[tuple[str, str], RulingRecord] = {}
    for ruling in lock.rulings:
        if ruling.ground.startswith("kept_") and ruling.ground != "kept_without_fill":
            last[ruling.subject, ruling.clause] = ruling
    kept = sorted(last.values(), key=lambda ruling: ruling.id)
    lines: list[str] = []
    for ruling in kept[:MOST_KEPT]:
        lines += ruled(ruling.id, ruling.says, width)
    if len(kept) > MOST_KEPT:
        names = list(dict.fromkeys(ruling.subject for ruling in kept[MOST_KEPT:]))
        lines += wrapped(f"The same for {listed(names, MOST_LABELS)}.", width)
    return tuple(lines)
