"""What a seal fixed, and what a run says about the runs before it."""

from __future__ import annotations

import shlex
from collections.abc import Sequence
from typing import TYPE_CHECKING

from beforehand.screen.digits import count, percent
from beforehand.screen.layout import INDENT, Section, page, shown, wrapped

if TYPE_CHECKING:
    from beforehand.lock import Lock
    from beforehand.sealing import Look, Seal

_ORDINALS = ("first", "second", "third", "fourth", "fifth", "sixth", "seventh", "eighth", "ninth", "tenth")
_SEEN = {
    "nothing": "nothing of the data had been seen",
    "predictors": "the predictors had been seen, the outcome had not",
    "everything": "everything had been seen, the outcome too",
}


def seal_text(seal: Seal, where: str, plan: str, *, new: bool, width: int = 100, colour: bool = False) -> str:
    """A seal as text.

    Parameters
    ----------
    seal : Seal
        The one in force.
    where, plan : str
        Names of the seals' file and the plan's.
    new : bool
        Whether it was made just now.
    width : int
        Cells of a line; 60 to 140 look right.
    colour : bool
        Whether headings are set off by terminal colours.
    """
    what = "an amendment" if seal.amendment is not None else "the plan as it is"
    told = f"Seal {seal.number}, {seal.sealed}, by {shown(seal.by)}: {_SEEN[seal.seen]}."
    lines = [*wrapped(told, width)]
    data = "The table was not there yet." if seal.data is None else "The table's fingerprint is in it."
    commit = "" if seal.commit is None else f" Commit {seal.commit[:12]}."
    lines += wrapped(data + commit, width)
    sections = [
        Section(
            title=f"Sealed: {what}" if new else "Sealed already: nothing has changed since",
            lines=tuple(lines),
            tone="good",
        )
    ]
    if seal.amendment is not None and new:
        amended = [
            line
            for change in seal.amendment.changes
            for line in wrapped(change["says"], width, rest=INDENT * 2)
        ]
        sections.append(Section(title=f"Amended: {shown(seal.amendment.why)}", lines=tuple(amended)))
    follow = [*wrapped(f"{where} holds {count(seal.number, 'seal')}; keep it with the plan.", width)]
    follow.append(f"{INDENT}beforehand run {shlex.quote(shown(plan))}")
    sections.append(Section(title="The record", lines=tuple(follow)))
    return page(sections, colour=colour)


def sealed_lines(lock: Lock, width: int) -> tuple[str, ...]:
    """The answer of the plan as first sealed, against the amended one above."""
    sealed, now = lock.sealed_answer, lock.answer
    if sealed is None:
        return wrapped("The plan as first sealed stops before any fit.", width)
    lines = [*wrapped(sealed.equation, width, rest=INDENT * 2)]
    explained = "" if sealed.r_squared is None else f"Variance explained {percent(sealed.r_squared)}"
    beside = "" if now is None or now.r_squared is None else f"; amended {percent(now.r_squared)}"
    if explained:
        lines += wrapped(f"{explained}{beside}.", width)
    here = {} if now is None else {term.term: term for term in now.terms}
    there = {term.term: term for term in sealed.terms}
    told = [f"{name} is in the amended model only" for name in here if name not in there]
    told += [f"{name} is in the sealed model only" for name in there if name not in here]
    told += [
        f"{name} moves by {abs(here[name].coefficient - term.coefficient) / term.standard_error:.2f} of its "
        "standard errors"
        for name, term in there.items()
        if name in here and term.standard_error and here[name].coefficient != term.coefficient
    ]
    said = "; ".join(told) if told else "The amendment changes no coefficient"
    return (*lines, *wrapped(f"{said}.", width))


def looks_sentence(looks: Sequence[Look]) -> str:
    """How many runs and how many different plans have met this outcome, this run among them."""
    if not looks:
        return ""
    from beforehand.sealing import plans_that_met

    last = looks[-1]
    met = [look for look in looks if look.outcome == last.outcome]
    number = list(dict.fromkeys(look.plan for look in met)).index(last.plan) + 1
    which = _ORDINALS[number - 1].capitalize() if number <= len(_ORDINALS) else f"Number {number}, a"
    plans = count(plans_that_met(looks, last.outcome), "plan")
    again = "" if len(met) == 1 else f"; {count(len(met), 'run')} so far by {plans}"
    return f"{which} plan run on this outcome{again}."
