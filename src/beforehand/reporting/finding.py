"""The key finding, and the same as methods and results that can be pasted."""

from __future__ import annotations

from beforehand.lock import Answer
from beforehand.reporting import words
from beforehand.reporting.context import Context
from beforehand.reporting.document import (
    Block,
    Equation,
    Heading,
    Listing,
    Paragraph,
    Said,
    Section,
    paragraph,
    section,
)
from beforehand.screen.answer import status_sentence
from beforehand.screen.digits import beside, figure, p_phrase
from beforehand.screen.finding import HELD_FIXED, per, predictor_sentence, ranked
from beforehand.screen.quality import rows_used
from beforehand.screen.quoted import quoted

MOST_EFFECTS = 12


def key_section(context: Context) -> Section | None:
    """One sentence, the equation, what a change of one unit goes with, what is explained, cautions."""
    lock, plan, answer = context.lock, context.plan, context.lock.answer
    word, meaning = status_sentence(lock, plan)
    explained = None
    if answer is not None and answer.predictors and answer.r_squared is not None:
        explained = Said(
            words.explained(answer.r_squared, answer.rows, len(answer.predictors)), _fits(answer)
        )
        if all(term.predictor is not None for term in answer.terms):
            explained = Said(f"{explained.text} {words.FROM_ZERO}", _fits(answer))
    blocks: list[Block | None] = [paragraph(Said(f"{word}. {meaning}", _fits(answer)), explained)]
    if lock.scrambled is not None:
        blocks.insert(0, paragraph(Said(lock.scrambled.says)))
    if answer is not None and answer.predictors and lock.status != "mean_only":
        blocks.append(Equation(answer.equation))
        held = f", {HELD_FIXED}" if len(answer.predictors) > 1 else ""
        blocks.append(
            Listing(
                tuple(
                    Said(
                        _large(predictor_sentence(block, answer, plan, "" if place else held)),
                        _ruled(context, block[0].predictor),
                    )
                    for place, block in enumerate(ranked(answer, plan)[:MOST_EFFECTS])
                )
            )
        )
    if answer is not None:
        cautions = [*answer.cautions]
        if context.rehearsal is not None:
            cautions = [*quoted(context.rehearsal, selects=plan.selects), *cautions]
        blocks.append(Heading(words.CAUTIONS))
        blocks.append(Listing(tuple(Said(text) for text in cautions)))
    return section("key", words.TITLES["key"], blocks, appendix=False)


def text_section(context: Context) -> Section | None:
    """Methods and results in the past tense."""
    return section("text", words.TITLES["text"], [_methods(context), _results(context)], appendix=False)


def _methods(context: Context) -> Paragraph:
    """What was done."""
    lock, plan, written = context.lock, context.plan, context.written
    steps = [str(step) for step in written.get("steps") or ()]
    rows = lock.answer.rows if lock.answer is not None else (lock.ledger[-1].rows if lock.ledger else 0)
    theory = {
        ruling.subject: ruling.id
        for ruling in lock.rulings
        if ruling.ground in ("kept_always", "kept_below_bound", "kept_last_of_group")
        and ruling.subject in lock.predictors
        and lock.predictors[ruling.subject].verdict != "removed"
    }
    selection = written.get("selection") or {}
    gone = [row for row in lock.rows_removed if row.step == "influence"]
    complete = next((stage.rows for stage in lock.ledger if stage.stage == "complete"), rows)
    said: list[Said | None] = [
        Said(words.decided_before(lock.plan.decisions)),
        Said(words.sealed(lock.seal.state, lock.seal.seals, lock.seal.before_first_look)),
        Said(words.analysed(rows, lock.data.rows, plan.outcome, len(lock.predictors)), _fits(lock.answer)),
        Said(words.steps_followed(steps)),
        *(
            Said(
                words.filled(fill.predictor, fill.method, fill.cells),
                _about(context, fill.predictor, "filled"),
            )
            for fill in lock.checks.fills
        ),
    ]
    if "influence" in steps:
        share = len(gone) / complete if complete else 0.0
        said.append(Said(words.rows_removed(len(gone), share), tuple(row.ruling for row in gone)))
    if "selection" in steps:
        said.append(Said(words.selected_by(str(selection.get("method", "backward")), plan.alpha)))
    said.append(Said(words.kept(list(theory)), tuple(theory.values())))
    if lock.answer is not None:
        said.append(Said(words.errors_used(lock.answer.errors, plan.level), _fits(lock.answer)))
    said.append(Said(words.many_tests(plan.multiplicity)))
    return paragraph(*said)


def _results(context: Context) -> Paragraph:
    """What came out."""
    lock, plan, answer = context.lock, context.plan, context.lock.answer
    said: list[Said | None] = [Said(f"In the end {words.STATUS[lock.status]}.")]
    if answer is None:
        return paragraph(*said)
    if lock.status == "mean_only" and answer.mean is not None:
        said.append(Said(status_sentence(lock, plan)[1], _fits(answer)))
    elif answer.r_squared is not None:
        said.append(
            Said(words.explained(answer.r_squared, answer.rows, len(answer.predictors)), _fits(answer))
        )
        if answer.f is not None and answer.f_df is not None:
            p = p_phrase(answer.f_p, plan.alpha)
            said.append(Said(words.whole_model(answer.f, answer.f_df, p), _fits(answer)))
        for term in answer.terms:
            if term.predictor is None or term.low is None or term.high is None:
                continue
            error = term.standard_error
            size, low, high = beside((term.coefficient, term.low, term.high), error)
            p = p_phrase(term.p, plan.alpha)
            said.append(
                Said(words.effect(term.term, size, low, high, plan.level, p, per(term, plan)), _fits(answer))
            )
    gone = [name for name, fate in lock.predictors.items() if fate.verdict == "removed"]
    rulings = tuple(
        fate.ruling for fate in lock.predictors.values() if fate.verdict == "removed" and fate.ruling
    )
    said.append(Said(words.left(gone), tuple(dict.fromkeys(rulings))))
    holds = sum(other.holds for other in lock.alternatives.values())
    said.append(Said(words.alternatives(holds, len(lock.alternatives))))
    if answer.residual_sd is not None and lock.status != "mean_only":
        said.append(
            Said(
                f"The typical error was {figure(answer.residual_sd)} {plan.unit}".rstrip() + ".",
                _fits(answer),
            )
        )
    said.append(Said(f"Rows: {rows_used(lock, answer.rows)}."))
    return paragraph(*said)


def _fits(answer: Answer | None) -> tuple[str, ...]:
    """The fit that the answer rests on."""
    return () if answer is None or answer.fit is None else (answer.fit,)


def _ruled(context: Context, name: str | None) -> tuple[str, ...]:
    """The ruling that decided a predictor, and the final fit."""
    fate = context.lock.predictors.get(name or "")
    ruling = (fate.ruling,) if fate is not None and fate.ruling else ()
    return (*ruling, *_fits(context.lock.answer))


def _about(context: Context, subject: str, ground: str) -> tuple[str, ...]:
    """Rulings of a kind about a subject."""
    return tuple(r.id for r in context.lock.rulings if r.subject == subject and r.ground == ground)


def _large(text: str) -> str:
    """A sentence that begins with an article, with a large letter."""
    return "The " + text[4:] if text.startswith("the ") else text
