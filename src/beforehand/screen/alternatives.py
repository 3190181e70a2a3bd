"""The declared alternatives side by side with the plan, and whether the answer holds."""

from __future__ import annotations

from typing import TYPE_CHECKING

from beforehand.screen.digits import percent
from beforehand.screen.layout import Column, labelled, shown, table, wrapped

if TYPE_CHECKING:
    from beforehand.lock import Answer, Lock

SHORTEST_NAME = 12
MOST_DIFFERENCES = 3


def alternative_lines(lock: Lock, width: int) -> tuple[str, ...]:
    """One line an alternative, beneath the plan's own, then what comes out differently."""
    names = ("as planned", *(shown(name) for name in lock.alternatives))
    statuses = (lock.status, *(run.status for run in lock.alternatives.values()))
    answers = (lock.answer, *(run.answer for run in lock.alternatives.values()))
    holds = ("", *("yes" if run.holds else "no" for run in lock.alternatives.values()))
    columns = (
        Column(head="", texts=names, align="left", least=SHORTEST_NAME),
        Column(head="Holds", texts=holds, align="left"),
        Column(head="Status", texts=tuple(status_word(status) for status in statuses), align="left"),
        Column(head="Predictors", texts=tuple(_predictors(answer) for answer in answers)),
        Column(head="Rows used", texts=tuple(_rows(answer) for answer in answers)),
        Column(head="Variance explained", texts=tuple(_explained(answer) for answer in answers)),
    )
    lines: list[str] = []
    for chosen in (columns, (*columns[:2], *columns[3:]), (*columns[:2], *columns[4:]), columns[:3]):
        lines += table(chosen, width) or ()
        if lines:
            break
    else:
        lines += labelled(tuple(zip(names, holds, strict=True)), width)
    for name, run in lock.alternatives.items():
        if run.differences:
            lines += wrapped(f"{name}: {_told(run.differences)}", width)
    return tuple(lines)


def alternatives_title(lock: Lock) -> str:
    """In how many alternatives the answer holds."""
    held = sum(run.holds for run in lock.alternatives.values())
    return f"Alternatives: the answer holds in {held} of {len(lock.alternatives)}"


def status_word(status: str) -> str:
    """A status in words."""
    return status.replace("_", " ")


def _told(differences: tuple[str, ...]) -> str:
    """The first differences, and how many more there are."""
    told = [text.rstrip(".") for text in differences[:MOST_DIFFERENCES]]
    left = len(differences) - len(told)
    return "; ".join(told) + (f"; {left} more." if left else ".")


def _predictors(answer: Answer | None) -> str:
    """How many predictors stand."""
    if answer is None:
        return "none"
    return str(len({term.predictor for term in answer.terms if term.predictor is not None}))


def _rows(answer: Answer | None) -> str:
    return "none" if answer is None else f"{answer.rows:,}"


def _explained(answer: Answer | None) -> str:
    return "none" if answer is None or answer.r_squared is None else percent(answer.r_squared)
