"""A picture before it is drawn: the question it answers, its words, and what draws it."""

from __future__ import annotations

import unicodedata
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field

from beforehand.picturing.sheet import Sheet

# Marks that make text run the other way for all that follows; the text's own direction needs none.
_TURNING = frozenset("\u200e\u200f\u202a\u202b\u202c\u202d\u202e\u2066\u2067\u2068\u2069\ufeff")


@dataclass(frozen=True, slots=True, kw_only=True)
class Picture:
    """One picture.

    Attributes
    ----------
    name : str
        Short name, such as ``trail``; of letters and underscores.
    title : str
        The question that it answers.
    alt : str
        What it shows, in words and numbers, for those who cannot see it.
    note : str
        How to read it, for a caption.
    width, height : float
        In inches, without the title.
    draw : callable
        Puts it on a sheet.
    """

    name: str
    title: str
    alt: str
    note: str
    width: float
    height: float
    draw: Callable[[Sheet], None] = field(repr=False, compare=False)


def shown(name: str, most: int = 60) -> str:
    """A name as it stands in a picture: on one line, without marks that turn text, not too long."""
    kept = "".join(
        " " if unicodedata.category(letter) in ("Cc", "Zl", "Zp") else letter
        for letter in name
        if letter not in _TURNING and unicodedata.category(letter) != "Cs"
    )
    kept = " ".join(kept.split())
    return kept if len(kept) <= most else kept[: most - 1].rstrip() + "…"


def listed(items: Sequence[str], most: int = 8) -> str:
    """Items in a sentence; what is beyond ``most`` is counted."""
    if len(items) > most + 1:
        return f"{', '.join(items[:most])} and {len(items) - most} more"
    if len(items) < 2:
        return "".join(items)
    return f"{', '.join(items[:-1])} and {items[-1]}"


def counted(n: int, one: str, many: str) -> str:
    """A number with its noun."""
    return f"{n:,} {one if n == 1 else many}"
