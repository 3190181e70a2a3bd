"""The one-screen answer of a run, from its lock alone."""

from __future__ import annotations

import shlex
from collections.abc import Sequence
from typing import TYPE_CHECKING

from beforehand.screen.alternatives import alternative_lines, alternatives_title
from beforehand.screen.coefficients import coefficient_lines, coefficient_scale
from beforehand.screen.digits import beside, count, figure, listed, p_phrase, trimmed
from beforehand.screen.doubts import doubt_lines
from beforehand.screen.finding import key_finding, outcome_unit
from beforehand.screen.layout import INDENT, Section, Tone, page, shorten, shown, wrapped
from beforehand.screen.planned import Planned, planned
from beforehand.screen.quality import quality_lines, rows_used
from beforehand.screen.quoted import quoted
from beforehand.screen.removals import kept_lines, removal_lines
from beforehand.screen.seals import looks_sentence, sealed_lines

if TYPE_CHECKING:
    from beforehand.lock import Answer, Lock, RulingRecord
    from beforehand.rehearsing.models import RehearsalRecord
    from beforehand.sealing import Look

MOST_SEAL_CHANGES = 5


def answer_text(
    lock: Lock,
    record: str,
    *,
    looks: Sequence[Look] = (),
    rehearsal: RehearsalRecord | None = None,
    width: int = 100,
    colour: bool = False,
) -> str:
    """The answer as one screen of text.

    Parameters
    ----------
    lock : Lock
        The record of the run.
    record : str
        Where the record stands, as the next commands should name it.
    looks : sequence of Look
        Runs on record so far, this one the last.
    rehearsal : RehearsalRecord, optional
        Of the same plan: what it says of p-values and R² stands beside them.
    width : int
        Cells of a line; 60 to 140 look right.
    colour : bool
        Whether headings are set off by terminal colours.

    Returns
    -------
    str
        Text that ends in a newline.
    """
    plan = planned(lock)
    sections = [_head(lock, width), _status(lock, plan, width)]
    if lock.answer is not None and lock.status != "mean_only":
        sections += _model(lock, lock.answer, plan, width)
    else:
        sections.append(Section(title="Rows", lines=_rows(lock, width)))
    sections += [
        Section(title="What was removed and why", lines=_removed(lock, width)),
        Section(title="Kept by rule", lines=kept_lines(lock, width)),
    ]
    if lock.answer is not None:
        lines = doubt_lines(lock, lock.answer, plan, width)
        sections.append(Section(title="Look twice", lines=lines, tone="careful"))
    if lock.alternatives:
        sections.append(Section(title=alternatives_title(lock), lines=alternative_lines(lock, width)))
    if lock.seal.state == "amended":
        sections.append(Section(title="As first sealed", lines=sealed_lines(lock, width)))
    if lock.answer is not None:
        lines = tuple(line for text in lock.answer.cautions for line in wrapped(text, width, first="  - "))
        sections.append(Section(title="Cautions", lines=lines, tone="careful"))
    if rehearsal is not None:
        lines = tuple(
            line
            for text in quoted(rehearsal, selects=plan.selects)
            for line in wrapped(text, width, first="  - ")
        )
        sections.append(Section(title="As rehearsed", lines=lines))
    sections.append(_record(lock, record, looks, width))
    return page([section for section in sections if section.lines], colour=colour)


def _head(lock: Lock, width: int) -> Section:
    """Title and question of the plan."""
    first, *rest = wrapped(lock.plan.title, width, first="", rest="")
    return Section(title=first, lines=(*rest, *wrapped(lock.plan.question, width)))


def status_sentence(lock: Lock, plan: Planned) -> tuple[str, str]:
    """The status in a few words, and what it means."""
    word, meaning = {
        "adopted": ("Adopted: the model stands", _adopted),
        "mean_only": ("Mean only: no predictor stands", _mean_only),
        "inconclusive": ("Inconclusive: the model as a whole is not significant", _inconclusive),
        "stopped": ("Stopped: there is no answer", _stopped),
    }[lock.status]
    return word, meaning(lock, plan)


def _status(lock: Lock, plan: Planned, width: int) -> Section:
    """The status, and what it means."""
    word, meaning = status_sentence(lock, plan)
    tone: Tone = "good" if lock.status == "adopted" else "careful"
    return Section(title=word, lines=wrapped(meaning, width), tone=tone, close=True)


def _adopted(lock: Lock, plan: Planned) -> str:
    """How many predictors stand."""
    verdicts = [entry.verdict for entry in lock.predictors.values()]
    stay = sum(verdict != "removed" for verdict in verdicts)
    return (
        f"{stay} of {count(len(verdicts), 'predictor')} {'is' if stay == 1 else 'are'} in it after "
        f"{count(len(lock.rulings), 'ruling')}, each by a rule of the plan."
    )


def _mean_only(lock: Lock, plan: Planned) -> str:
    """The mean with its interval, which is the answer."""
    answer = lock.answer
    if answer is None or answer.mean is None:
        return "The mean is the answer."
    mean, unit = answer.mean, outcome_unit(answer, plan)
    half = None if mean.low is None or mean.high is None else (mean.high - mean.low) / 4.0
    value, low, high = beside((mean.mean, mean.low, mean.high), half)
    interval = "" if half is None else f" ({plan.level} interval {low} to {high})"
    spread = ""
    if mean.sd is not None:
        spread = f"; the rows spread about it by {f'{figure(mean.sd)} {unit}'.strip()} (standard deviation)"
    return f"The mean of {plan.outcome} is the answer: {f'{value} {unit}'.strip()}{interval}{spread}."


def _inconclusive(lock: Lock, plan: Planned) -> str:
    """What a weak model with theory in it says, which is little."""
    f_p = None if lock.answer is None else lock.answer.f_p
    start = "" if f_p is None else f"Its {p_phrase(f_p, plan.alpha)} is above {trimmed(plan.alpha)}. "
    return (
        f"{start}Rules keep predictors in it, so it is reported and not adopted: these rows neither show "
        "nor exclude what the plan asks about."
    )


def _stopped(lock: Lock, plan: Planned) -> str:
    """The ruling that stopped the run."""
    ruling = stopping_ruling(lock)
    return "The plan demands it." if ruling is None else f"{ruling.id}: {ruling.says}"


def stopping_ruling(lock: Lock) -> RulingRecord | None:
    """The ruling that stopped a run."""
    stops = [
        ruling
        for ruling in lock.rulings
        if ruling.ground.startswith("stops_")
        or ruling.ground.endswith("_stop")
        or ruling.ground in ("kept_without_fill", "nothing_to_learn_from")
    ]
    return stops[-1] if stops else (lock.rulings[-1] if lock.rulings else None)


def _model(lock: Lock, answer: Answer, plan: Planned, width: int) -> list[Section]:
    """The key finding, the coefficients and the fit, under headings that fit the status."""
    has_predictors = any(term.predictor is not None for term in answer.terms)
    sections: list[Section] = []
    if has_predictors and lock.status == "adopted":
        sections.append(Section(title="Key finding", lines=key_finding(answer, plan, width)))
    title = {
        "adopted": "Coefficients",
        "inconclusive": "The model that is reported, not adopted",
    }.get(lock.status, "The model when the run stopped, not an answer")
    if has_predictors:
        first, *rest = wrapped(f"{title}, {coefficient_scale(answer, plan)}", width, first="")
        lines = (*rest, *coefficient_lines(answer, plan, width))
        sections.append(Section(title=first, lines=lines))
    sections.append(Section(title="How well it fits", lines=quality_lines(lock, answer, plan, width)))
    return sections


def _removed(lock: Lock, width: int) -> tuple[str, ...]:
    """What was removed; that nothing was is worth a line, unless the run never came to it."""
    lines = removal_lines(lock, width)
    return lines if lines or lock.status == "stopped" else wrapped("Nothing was removed.", width)


def _rows(lock: Lock, width: int) -> tuple[str, ...]:
    """The rows of a run without a model."""
    if not lock.ledger:
        return ()
    used = lock.ledger[-1].rows if lock.answer is None else lock.answer.rows
    return wrapped(f"Rows used: {rows_used(lock, used)}.", width)


def _record(lock: Lock, record: str, looks: Sequence[Look], width: int) -> Section:
    """Where everything stands, and what to type next."""
    size = f"{count(len(lock.fits), 'fit')} and {count(len(lock.rulings), 'ruling')}"
    told = f"{record} holds {size}. {seal_sentence(lock)} {looks_sentence(looks)}".strip()
    lines = list(wrapped(told, width))
    name, subject = shlex.quote(shown(record)), example_subject(lock)
    # Commands are never broken over lines: one that is copied must work.
    traced = "" if subject is None else f"{INDENT}beforehand trace {name} {shlex.quote(shown(subject))}"
    commands = [line for line in (traced, f"{INDENT}beforehand replay {name}") if line]
    return Section(title="The record", lines=(*lines, *commands))


def seal_sentence(lock: Lock) -> str:
    """What the record shows about when the plan was fixed."""
    changes = [shorten(change.says.rstrip("."), 120) for change in lock.seal.changes]
    told = f": {listed(changes, MOST_SEAL_CHANGES)}." if changes else "."
    late = lock.seal.before_first_look is False
    return {
        "sealed": "The plan was sealed, but after the first run on this outcome."
        if late
        else "The plan was sealed before this run.",
        "unsealed": "The plan is not sealed, so the record cannot show that it came first.",
        "amended": f"The plan was amended after its seal{told}",
        "deviates": f"The plan deviates from its seal{told}",
    }[lock.seal.state]


def example_subject(lock: Lock) -> str | None:
    """A predictor worth a trace: the last one removed, else the first in the plan."""
    order = {ruling.id: place for place, ruling in enumerate(lock.rulings)}
    gone = [
        (order.get(entry.ruling or "", -1), name)
        for name, entry in lock.predictors.items()
        if entry.verdict == "removed"
    ]
    return max(gone)[1] if gone else next(iter(lock.predictors), None)
