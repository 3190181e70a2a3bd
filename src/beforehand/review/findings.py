"""What a review finds: one thing at a time, with its place in the plan and one plain sentence."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Literal

Severity = Literal["note", "caution"]

# Names listed in one sentence before the rest are only counted.
NAMED = 5


@dataclass(frozen=True, slots=True, kw_only=True)
class Finding:
    """One thing that a reviewer should know.

    Attributes
    ----------
    code : str
        Stable name of this kind of finding, for programs.
    clause : str
        Path of the field of the plan that it is about.
    says : str
        One plain sentence.
    severity : str
        ``note``: worth knowing. ``caution``: the answer could mislead, or a rule does not do what
        it seems to.
    """

    code: str
    clause: str
    says: str
    severity: Severity


def note(code: str, clause: str, says: str) -> Finding:
    """A finding that is worth knowing."""
    return Finding(code=code, clause=clause, says=says, severity="note")


def caution(code: str, clause: str, says: str) -> Finding:
    """A finding that a reviewer should not pass over."""
    return Finding(code=code, clause=clause, says=says, severity="caution")


def listed(names: Iterable[str]) -> str:
    """Names as a phrase: ``a``, ``a and b``, ``a, b and c``, or the first few and how many more."""
    every: Sequence[str] = tuple(names)
    if len(every) > NAMED:
        return f"{', '.join(every[:NAMED])} and {len(every) - NAMED} more"
    if len(every) < 2:
        return "".join(every)
    return f"{', '.join(every[:-1])} and {every[-1]}"


def have(names: Sequence[str], one: str, many: str) -> str:
    """The verb form for so many names."""
    return one if len(names) == 1 else many


def percent(share: float) -> str:
    """A share as a percentage, as in ``5 %``."""
    return f"{100.0 * share:.3g} %"


def figure(value: float) -> str:
    """A number in few digits, without an exponent where a person would not write one."""
    return f"{value:,.0f}" if 1e4 <= abs(value) < 1e15 else f"{value:.3g}"
