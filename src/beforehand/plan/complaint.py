"""One thing that does not fit in a plan, before its line is known; and the phrases that recur."""

from __future__ import annotations

from collections.abc import Collection, Hashable, Iterator, Sequence
from dataclasses import dataclass
from typing import TypeVar

from beforehand.faults import did_you_mean

UNKNOWN_NAME = "unknown_name"

# Looking for the nearest of more names takes longer than a person waits for a message.
_MOST_KNOWN = 300

Word = TypeVar("Word", bound=Hashable)


@dataclass(frozen=True, slots=True)
class Complaint:
    """What is wrong, and where.

    Attributes
    ----------
    place : str
        Path of the field, ``keep[0].predictor``.
    what : str
        What is wrong and what would be right.
    code : str
        Stable name of this kind of fault.
    """

    place: str
    what: str
    code: str


def near(word: str, known: Collection[str]) -> str:
    """The tail of a message that names the nearest right word, where one is near."""
    return did_you_mean(word, known) if len(known) <= _MOST_KNOWN else ""


def unknown(place: str, name: str, known: Collection[str]) -> Complaint:
    """A name that is not among the predictors."""
    what = f"names {name!r}, which is not among the predictors{near(name, known)}"
    return Complaint(place, what, UNKNOWN_NAME)


def repeats(words: Sequence[Word]) -> Iterator[tuple[int, int, Word]]:
    """Each word that stood before: its position, the position it first stood at, and the word."""
    first: dict[Word, int] = {}
    for number, word in enumerate(words):
        if first.setdefault(word, number) != number:
            yield number, first[word], word


def repeated(place: str, words: Sequence[str]) -> Iterator[Complaint]:
    """A complaint for each word that stands in a list a second time."""
    for number, _, word in repeats(words):
        yield Complaint(f"{place}[{number}]", f"names {word!r} a second time", "repeated")
