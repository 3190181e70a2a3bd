"""Two answers side by side: each coefficient with its shift in old standard errors, and the fit."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from beforehand.lock import Answer, AnswerTerm, Lock


@dataclass(frozen=True, slots=True, kw_only=True)
class CoefficientPair:
    """One term of the two final tables.

    Attributes
    ----------
    term : str
    old, new : float or None
        Coefficients; None on the side that does not have the term.
    old_error, new_error : float or None
        Their standard errors.
    shift : float or None
        New less old in old standard errors; None where that says nothing.
    why : str or None
        Why there is no shift.
    """

    term: str
    old: float | None
    new: float | None
    old_error: float | None
    new_error: float | None
    shift: float | None
    why: str | None


@dataclass(frozen=True, slots=True, kw_only=True)
class Figure:
    """One figure of the two fits.

    Attributes
    ----------
    name : str
        Its name in the lock: ``r_squared``, ``residual_sd``, ``rows``.
    old, new : float or None
    """

    name: str
    old: float | None
    new: float | None


FIGURES = ("rows", "r_squared", "adjusted_r_squared", "predicted_r_squared", "residual_sd")


def coefficients(old: Lock, new: Lock) -> tuple[CoefficientPair, ...]:
    """Every term of either final table, the old table's first and in its order."""
    first, second = _terms(old.answer), _terms(new.answer)
    scale = _other_scale(old.answer, new.answer)
    baselines = _baselines(old), _baselines(new)
    return tuple(
        _pair(
            term,
            first.get(term),
            second.get(term),
            scale or _other_term(first.get(term), second.get(term), baselines),
        )
        for term in dict.fromkeys([*first, *second])
    )


def figures(old: Answer | None, new: Answer | None) -> tuple[Figure, ...]:
    """Rows, variance explained and typical error of the two answers; empty where neither has one."""
    if old is None and new is None:
        return ()
    return tuple(
        Figure(
            name=name,
            old=None if old is None else getattr(old, name),
            new=None if new is None else getattr(new, name),
        )
        for name in FIGURES
    )


def _terms(answer: Answer | None) -> dict[str, AnswerTerm]:
    return {} if answer is None else {term.term: term for term in answer.terms}


def _pair(term: str, old: AnswerTerm | None, new: AnswerTerm | None, why: str | None) -> CoefficientPair:
    """One term with its shift, or with the reason why there is none."""
    shift = None
    if old is None or new is None:
        why = "new" if old is None else "gone"
    elif why is None and not old.standard_error:
        why = "no standard error"
    elif why is None and old.standard_error:
        shift = (new.coefficient - old.coefficient) / old.standard_error
    return CoefficientPair(
        term=term,
        old=None if old is None else old.coefficient,
        new=None if new is None else new.coefficient,
        old_error=None if old is None else old.standard_error,
        new_error=None if new is None else new.standard_error,
        shift=shift,
        why=why,
    )


def _other_scale(old: Answer | None, new: Answer | None) -> str | None:
    """Why no coefficient can be held against its old value, if that is so."""
    if old is None or new is None:
        return None
    first, second = old.outcome, new.outcome
    if first.column != second.column:
        return "another outcome"
    same = first.transform == second.transform and first.exponent == second.exponent
    return None if same else "another scale of the outcome"


def _other_term(
    old: AnswerTerm | None, new: AnswerTerm | None, baselines: tuple[Mapping[str, str], Mapping[str, str]]
) -> str | None:
    """Why this coefficient cannot be held against its old value, if that is so."""
    if old is None or new is None:
        return None
    if (old.transform, old.exponent) != (new.transform, new.exponent):
        return "another form of the predictor"
    of_level = old.level is not None and old.predictor is not None
    if of_level and baselines[0].get(old.predictor or "") != baselines[1].get(old.predictor or ""):
        return "another baseline"
    return None


def _baselines(lock: Lock) -> dict[str, str]:
    """Baseline of each category, from the plan in the lock."""
    predictors = lock.plan.written.get("predictors")
    if not isinstance(predictors, tuple):
        return {}
    return {
        str(one["column"]): str(one["baseline"])
        for one in predictors
        if isinstance(one, Mapping) and "column" in one and "baseline" in one
    }
