"""Short pages that explain the program from inside it: one a block of the plan, and a few more.

The reasons are written by hand in Markdown beside this module. The list of a block's fields is made
from the models of the plan when a page is asked for, so that it cannot fall behind them.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cache
from importlib.resources import files

from beforehand.faults import Fault, InputError, did_you_mean
from beforehand.guide.fields import described_fields

# Where a page shows the fields of its block.
_FIELDS = "{fields}"

_OPENING = ("first-plan",)

# One page for each block of the plan, in the order of the plan.
BLOCKS = (
    "language",
    "data",
    "purpose",
    "eligibility",
    "derive",
    "outcome",
    "predictors",
    "products",
    "keep",
    "alpha",
    "multiplicity",
    "intercept",
    "steps",
    "missing_data",
    "assumptions",
    "transforms",
    "collinearity",
    "influence",
    "selection",
    "weak_model",
    "final_checks",
    "errors",
    "expects",
    "rehearsal",
    "alternatives",
    "refresh",
    "amendments",
)

_CLOSING = (
    "lock",
    "report",
    "predict",
    "seal",
    "rehearse",
    "compare",
    "handover",
    "rules",
    "numbers",
    "cautions",
    "bad-input",
)

# Keys of the plan that are too small for a page of their own.
_ELSEWHERE: Mapping[str, str] = {"title": "language", "question": "language", "written_by": "language"}


@dataclass(frozen=True, slots=True, kw_only=True)
class Page:
    """A page as it stands in the list of pages.

    Attributes
    ----------
    name : str
        What to ask for it by.
    title, summary : str
        Its heading and its first sentence.
    """

    name: str
    title: str
    summary: str


@cache
def pages() -> tuple[Page, ...]:
    """All pages, in the order in which they are best read."""
    return tuple(_listed(name) for name in (*_OPENING, *BLOCKS, *_CLOSING))


def page(name: str) -> str:
    """The text of a page, in Markdown.

    Parameters
    ----------
    name : str
        Name of the page, or a top-level key of the plan. A hyphen and an underscore are the same
        here, and so are capitals and small letters.

    Returns
    -------
    str
        Ends with one line break.

    Raises
    ------
    InputError
        There is no such page; the message has the nearest name.
    """
    text = _source(_known(name))
    if _FIELDS not in text:
        return text
    keys = [key for key, where in _ELSEWHERE.items() if where == _known(name)]
    return text.replace(_FIELDS, described_fields((_known(name), *keys)))


def _known(name: str) -> str:
    """The name of a page as it is written here."""
    folded = name.strip().casefold().replace("-", "_")
    names = {known.replace("-", "_"): known for known in (*_OPENING, *BLOCKS, *_CLOSING)} | dict(_ELSEWHERE)
    if folded in names:
        return names[folded]
    hint = did_you_mean(name.strip(), dict.fromkeys([*names.values(), *_ELSEWHERE]))
    raise InputError(
        [Fault(file="guide", line=None, place=name, what=f"there is no such page{hint}", code="guide.page")]
    )


@cache
def _source(name: str) -> str:
    """A page as it was written by hand."""
    return files("beforehand.guide").joinpath(f"{name}.md").read_text(encoding="utf-8")


def _listed(name: str) -> Page:
    """The heading of a page and its first sentence, which stand on its first and third line."""
    heading, _, summary, *_ = _source(name).split("\n")
    return Page(name=name, title=heading.removeprefix("# "), summary=summary)
