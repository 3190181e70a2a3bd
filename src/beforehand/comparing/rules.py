"""The kinds of rule by which a change of one field of a plan is classed.

A change is ``looser`` where the plan asks less before it claims something, or lets more of the data
be set aside; ``stricter`` the other way round; ``different`` where neither can be said; ``wording``
where no number and no ruling can depend on it. Every rule carries the reason in a few words.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final, Literal

Grade = Literal["looser", "stricter", "different", "wording"]

# From the change that a reviewer looks at first.
GRADES_IN_ORDER: tuple[Grade, ...] = ("looser", "different", "stricter", "wording")

# Stands in `Words.order` for every value that is not named there.
ANY_OTHER: Final = "any other"


@dataclass(frozen=True, slots=True, kw_only=True)
class Inside:
    """A block that is always there: only what stands in it can change."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Always:
    """Any change is of one grade.

    Attributes
    ----------
    grade : str
    why : str
    """

    grade: Grade
    why: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Number:
    """A number, or a limit in n and p; null is a limit that nothing reaches.

    Attributes
    ----------
    up : {"looser", "stricter"}
        Grade of a larger number; a smaller one has the other grade.
    looser, stricter : str
        What follows, in a few words.
    """

    up: Literal["looser", "stricter"]
    looser: str
    stricter: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Words:
    """A choice between values that can be ranked.

    Attributes
    ----------
    order : tuple
        Values from the strictest to the loosest; ``ANY_OTHER`` stands for those not named.
    looser, stricter : str
        What follows, in a few words.
    different : str
        The same between two values of one rank.
    """

    order: tuple[str | bool | None, ...]
    looser: str
    stricter: str
    different: str = "another rule decides"


@dataclass(frozen=True, slots=True, kw_only=True)
class Ends:
    """A pair [low, high]; wider is looser, narrower is stricter; null leaves an end open."""

    looser: str
    stricter: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Items:
    """A list or mapping: what came, what went, and where it has one, the order.

    Attributes
    ----------
    came, went : str
        Grades of an item more and of an item less.
    why_came, why_went : str
    order : {"different", "wording"} or None
        Grade of another order of the same items; None for mappings, which have none.
    why_order : str
    changed : str
        Grade of another value under the same name, where the value has no fields of its own.
    why_changed : str
    """

    came: Grade
    went: Grade
    why_came: str
    why_went: str
    order: Literal["different", "wording"] | None = "different"
    why_order: str = "the order decides between equals"
    changed: Grade = "different"
    why_changed: str = "another value counts"


Rule = Inside | Always | Number | Words | Ends | Items
