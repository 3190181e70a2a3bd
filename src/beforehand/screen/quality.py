"""How well the model fits and on which rows: one labelled line a fact, in words."""

from __future__ import annotations

from collections.abc import Mapping
from itertools import pairwise
from typing import TYPE_CHECKING

from beforehand.screen.digits import count, figure, p_phrase, percent
from beforehand.screen.finding import outcome_unit, outcome_words
from beforehand.screen.layout import labelled
from beforehand.screen.planned import Planned

if TYPE_CHECKING:
    from beforehand.lock import Answer, LedgerStage, Lock

_LOST_AT = {"with an outcome": "without an outcome", "complete": "incomplete"}


def quality_lines(lock: Lock, answer: Answer, plan: Planned, width: int) -> tuple[str, ...]:
    """Variance explained, typical error, the model as a whole, the full model, rows."""
    unit = outcome_unit(answer, plan)
    pairs: list[tuple[str, str]] = []
    if answer.r_squared is not None:
        pairs.append(("Variance explained (R²)", _explained(answer)))
    if answer.residual_sd is not None:
        where = unit or f"on the scale of {outcome_words(answer)}"
        pairs.append(("Typical error", f"{figure(answer.residual_sd)} {where}"))
    if answer.f is not None and answer.f_df is not None:
        between, within = answer.f_df
        pairs.append(
            (
                "Model as a whole",
                f"F {figure(answer.f)} on {between:,} and {within:,} degrees of freedom, "
                f"{p_phrase(answer.f_p, plan.alpha)}",
            )
        )
    full = _full_model(lock, answer)
    if full:
        pairs.append(("Before selection", full))
    pairs.append(("Rows used", rows_used(lock, answer.rows)))
    return labelled(pairs, width)


def _explained(answer: Answer) -> str:
    """Explained, unexplained, and what is left of it for rows that the fit has not seen."""
    explained = answer.r_squared if answer.r_squared is not None else 0.0
    parts = [percent(explained), f"unexplained {percent(1.0 - explained)}"]
    if answer.predicted_r_squared is not None:
        parts.append(f"{percent(max(answer.predicted_r_squared, 0.0))} for rows left out one by one")
    if all(term.predictor is not None for term in answer.terms):
        parts.append("measured from 0, as the fit has no intercept")
    return "; ".join(parts)


def _full_model(lock: Lock, answer: Answer) -> str:
    """The model before selection, where it is another than the answer."""
    if answer.full_model is None or answer.full_model == answer.fit:
        return ""
    fit = next((fit for fit in lock.fits if fit.id == answer.full_model), None)
    if fit is None or fit.r_squared is None:
        return ""
    return f"{count(len(fit.tests), 'predictor')}, {percent(fit.r_squared)} explained ({fit.id})"


def rows_used(lock: Lock, used: int) -> str:
    """``396 of 412 read`` and where the others went, each cause once."""
    lost: dict[str, int] = {}
    steps = {ruling.id: ruling.step for ruling in lock.rulings}
    for before, after in pairwise(lock.ledger):
        if after.rows < before.rows:
            cause = _cause(after, steps)
            lost[cause] = lost.get(cause, 0) + before.rows - after.rows
    losses = [f"{rows:,} {cause}" for cause, rows in lost.items()]
    text = f"{used:,} of {lock.data.rows:,} read"
    return f"{text}; {', '.join(losses)}" if losses else text


def _cause(stage: LedgerStage, steps: Mapping[str, str]) -> str:
    """Why a stage of the ledger has fewer rows than the one before it."""
    name = stage.stage.replace("_", " ")
    if name in _LOST_AT:
        return _LOST_AT[name]
    ruling = name.removeprefix("after ")
    if ruling in steps:
        return f"removed by {steps[ruling].replace('_', ' ')}"
    return f"not eligible ({stage.because or name})"
