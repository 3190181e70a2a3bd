"""A copy of a lock that gives no row away, to be shown to people who may not see the data.

It is no lock and cannot be read as one: it begins otherwise, carries the digest of the original under
another name, and lacks what could be used to find a row. What may stand is decided in ``released``.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable, Mapping, Sequence
from typing import Any

from beforehand.faults import Fault, LockError
from beforehand.handing.labels import is_about_a_row
from beforehand.handing.released import Released, parts_of, released, too_few
from beforehand.lock import Alternative, Answer, Checks, Lock, RulingRecord
from beforehand.lock.trail import FitRecord
from beforehand.plan.yaml_text import yaml_text

FEWEST = 5

HEAD = (
    "# Written by beforehand. This is not a lockfile but a copy of one without what could give a row away:\n"
    "# fits on other rows than the answer's, single values, row labels, small groups.\n"
)

# What needs the outcome's total spread, and so the value of a row that a coefficient takes up.
_OF_THE_SPREAD = frozenset(
    {
        "r_squared", "adjusted_r_squared", "predicted_r_squared", "press", "f", "f_p", "share_explained",
        "share_unexplained", "equation", "mean",
    }
)  # fmt: skip
_OF_A_TERM = frozenset(
    {"coefficient", "standard_error", "t", "p", "low", "high", "standardized", "adjusted_p"}
)
_OF_A_TEST = frozenset({"statistic", "p", "semipartial_r_squared", "adjusted_p", "alone"})

Data = dict[str, Any]


def share_safe(lock: Lock, *, fewest: int = FEWEST) -> Mapping[str, Any]:
    """A copy of a lock that gives no row away.

    Parameters
    ----------
    lock : Lock
        With its digest.
    fewest : int
        Groups of fewer rows than this are not told; at least 2.

    Returns
    -------
    mapping
        Plain data in the order of the file; see ``safe_text``.

    Raises
    ------
    LockError
        The answer itself rests on so few rows that nothing of it may stand.
    ValueError
        ``fewest`` is below 2.
    """
    if fewest < 2:
        raise ValueError(f"fewest is {fewest}; a group of one row is a row")
    reason = too_few(lock, fewest)
    if reason is not None:
        what = f"cannot be made share-safe: {reason}"
        raise LockError([Fault(file=lock.plan.file, line=None, place="", what=what, code="lock.not_safe")])
    stands = released(lock, fewest)
    kept = stands.fits(lock)
    return {
        "share_safe": {"fewest": fewest},
        "original": lock.digest,
        "left_out": _left_out(lock, stands, kept),
        "plan": lock.plan.model_dump(by_alias=True),
        "seal": lock.seal.model_dump(by_alias=True),
        "data": {"rows": lock.data.rows, "labelled": lock.data.labelled},
        "status": lock.status,
        "answer": _answer(lock, stands),
        "sealed_plan": None if lock.sealed_plan is None else lock.sealed_plan.model_dump(by_alias=True),
        **_body(lock, stands),
        "alternatives": {
            name: _alternative(lock, other, stands) for name, other in lock.alternatives.items()
        },
        "environment": lock.environment.model_dump(),
    }


def safe_text(lock: Lock, *, fewest: int = FEWEST) -> str:
    """The copy as it stands in a ``NAME.safe.yaml``."""
    return HEAD + yaml_text(share_safe(lock, fewest=fewest))


def _left_out(lock: Lock, stands: Released, kept: frozenset[str]) -> Data:
    """What is missing, and why."""
    said = [
        "Fits on other rows than the answer's: two fits that differ by a row give that row.",
        "Smallest and largest values, quartiles and medians: each is the value of a row.",
        "Measures and labels of single rows, digests of rows and of the table.",
    ]
    if stands.tied:
        said.append(
            f"What hangs on groups of fewer than {stands.fewest} rows in {', '.join(sorted(stands.tied))}: "
            "their coefficients, the intercept, and R² and F, which need the outcome's total spread."
        )
    if lock.sealed_answer is not None:
        said.append("The answer of the plan as first sealed: its rows may be others.")
    return {"fits": len(lock.fits) - len(kept), "because": said}


def _body(record: Lock | Alternative, stands: Released) -> Data:
    """What a run and an alternative both tell."""
    rulings = stands.rulings(record)
    removed = Counter(row.step for row in record.rows_removed)
    return {
        "ledger": [stage.model_dump() for stage in record.ledger if not stage.stage.startswith("after R")],
        "rows_removed": {step: _count(rows, stands) for step, rows in removed.items()},
        "predictors": {
            name: {
                "verdict": fate.verdict,
                "ruling": fate.ruling,
                "transform": fate.transform,
                "exponent": _exponent(fate.exponent, stands),
                **({"says": fate.says} if fate.ruling in rulings else {}),
            }
            for name, fate in record.predictors.items()
        },
        "rulings": [_ruling(ruling, ruling.id in rulings) for ruling in record.rulings],
        "fits": [_fit(fit, stands) for fit in record.fits if stands.fit(fit)],
        "checks": _checks(record, stands),
    }


def _count(rows: int, stands: Released) -> int | str:
    """A number of rows; a small one is not told exactly."""
    return f"fewer than {stands.fewest}" if 0 < rows < stands.fewest else rows


def _exponent(exponent: float | None, stands: Released) -> float | None:
    """A learned exponent; to three digits where it was learned on rows that are not the answer's."""
    if exponent is None or stands.every_row:
        return exponent
    return float(f"{exponent:.3g}")


def _without(data: Data, keys: Iterable[str]) -> Data:
    """The same with nothing under some keys."""
    gone = frozenset(keys)
    return {key: None if key in gone else value for key, value in data.items()}


def _ruling(ruling: RulingRecord, stands: bool) -> Data:
    """A ruling; its numbers only where they stand."""
    if stands:
        return ruling.model_dump()
    return {
        "id": ruling.id,
        "step": ruling.step,
        "clause": ruling.clause,
        "subject": "a row" if is_about_a_row(ruling.ground) else ruling.subject,
        "verdict": ruling.verdict,
        "ground": ruling.ground,
        "because": ruling.because,
    }


def _hangs(predictor: str | None, stands: Released) -> bool:
    """Whether a term takes up a few rows: one of a rare predictor, or the intercept beside it."""
    return bool(stands.tied) and (predictor is None or bool(parts_of([predictor]) & stands.tied))


def _fit(fit: FitRecord, stands: Released) -> Data:
    """A fit on the answer's rows."""
    data = fit.model_dump()
    data["rows"] = {"n": fit.rows.n}
    if fit.why.startswith("without row "):
        data["why"] = "without a row"
    data["outcome"]["exponent"] = _exponent(fit.outcome.exponent, stands)
    data["terms"] = _terms(data["terms"], stands)
    data["tests"] = [
        _without(test, _OF_A_TEST & set(test)) if _hangs(test["predictor"], stands) else test
        for test in data["tests"]
    ]
    return _without(data, _OF_THE_SPREAD & set(data)) if stands.tied else data


def _terms(terms: Sequence[Data], stands: Released) -> list[Data]:
    """Coefficients, without what takes up a few rows."""
    found: list[Data] = []
    for term in terms:
        made = {**term, "exponent": _exponent(term["exponent"], stands)}
        if _hangs(term["predictor"], stands):
            made = _without(made, _OF_A_TERM)
        elif stands.tied:
            made = _without(made, ["standardized"] if "standardized" in made else [])
        optional = ("transform", "exponent", "level")
        found.append({key: value for key, value in made.items() if value is not None or key not in optional})
    return found


def _answer(record: Lock | Alternative, stands: Released) -> Data | None:
    """The answer, without what rests on other rows than its own."""
    answer = record.answer
    if answer is None:
        return None
    data = answer.model_dump()
    fits, rulings = stands.fits(record), stands.rulings(record)
    untold = {ruling.says for ruling in record.rulings if ruling.id not in rulings}
    data["outcome"]["exponent"] = _exponent(answer.outcome.exponent, stands)
    data["terms"] = _terms(data["terms"], stands)
    data["predictors"] = [_predictor(one, fits, stands) for one in data["predictors"]]
    data["near_misses"] = [one for one in data["near_misses"] if one["predictor"] not in stands.rare]
    data["sign_contradictions"] = [
        _without(one, ("coefficient", "p")) if _hangs(one["predictor"], stands) else one
        for one in data["sign_contradictions"]
    ]
    data["full_model"] = answer.full_model if answer.full_model in fits else None
    if not _told(answer, rulings):
        data["fragility"] = None
    data["cautions"] = [said for said in answer.cautions if said not in untold]
    return _without(data, _OF_THE_SPREAD) if stands.tied else data


def _told(answer: Answer, rulings: frozenset[str]) -> bool:
    """Whether the ruling that was nearest to flipping may be told."""
    return answer.fragility is not None and answer.fragility.ruling in rulings


def _predictor(data: Data, fits: frozenset[str], stands: Released) -> Data:
    """A predictor of the answer as a whole."""
    if _hangs(data["predictor"], stands):
        return _without(data, _OF_A_TEST)
    gone = {"semipartial_r_squared"} if stands.tied else set()
    if data["alone"] is not None and data["alone"]["fit"] not in fits:
        gone.add("alone")
    return _without(data, gone)


def _checks(record: Lock | Alternative, stands: Released) -> Data:
    """What was looked at, of the answer's rows."""
    checks = record.checks
    told = stands.checks(record)
    fitted = parts_of(term.predictor for fit in record.fits if stands.fit(fit) for term in fit.terms)
    outcome = None if record.answer is None else record.answer.outcome.column
    filled = {fill.predictor for fill in checks.fills}
    rare_stages = {one.stage for one in checks.inflation if one.predictor in stands.rare}
    return {
        "descriptives": [
            _described(
                column.model_dump(),
                stands.described(column, column.column in filled, column.column in fitted | {outcome}),
                stands,
            )
            for column in checks.descriptives
        ],
        "missing": [
            {"predictor": one.predictor, "missing": _count(one.missing, stands)} for one in checks.missing
        ],
        "fills": [
            {"predictor": one.predictor, "method": one.method, "cells": _count(one.cells, stands)}
            for one in checks.fills
        ],
        "correlations": [
            one.model_dump()
            for one in checks.correlations
            if stands.stage(one.stage) and not {one.first, one.second} & stands.rare
        ],
        "inflation": [
            one.model_dump()
            for one in checks.inflation
            if stands.stage(one.stage) and one.stage not in rare_stages
        ],
        "condition": [
            one.model_dump()
            for one in checks.condition
            if stands.stage(one.stage) and one.stage not in rare_stages
        ],
        "assumptions": [
            one.model_dump()
            if one.id in told
            else {"id": one.id, "stage": one.stage, "check": one.check, "subject": one.subject,
                  "verdict": one.verdict}
            for one in checks.assumptions
        ],
        "influence": _influence(checks, stands),
    }  # fmt: skip


def _influence(checks: Checks, stands: Released) -> Data:
    """How many rows were looked at one by one; none of their measures."""
    return {
        "flagged": _count(len(checks.influence), stands),
        "stayed": _count(sum(row.stays for row in checks.influence), stands),
    }


def _described(data: Data, moments: bool, stands: Released) -> Data:
    """A column: its moments where they stand, its levels pooled, never a single value."""
    told = {key: data[key] for key in ("column", "kind", "unit", "n")}
    told["missing"] = _count(data["missing"], stands)
    if not moments:
        return told
    if data["levels"]:
        return told | pooled(data["levels"], stands.fewest)
    rare = data["column"] in stands.rare or bool(stands.tied)
    return told if rare else told | {key: data[key] for key in ("mean", "sd", "skewness", "kurtosis")}


def pooled(levels: Mapping[str, int], fewest: int) -> Data:
    """Rows of each level; small ones together, with the next one where they are still too few.

    A single level that is left out could be found from the total.
    """
    ordered = sorted(levels.items(), key=lambda item: item[1])
    together: list[str] = []
    rows = 0
    for name, count in ordered:
        if count >= fewest and (not together or rows >= fewest):
            break
        together.append(name)
        rows += count
    if not together:
        return {"levels": dict(levels)}
    alone = {name: count for name, count in levels.items() if name not in together}
    listed = [name for name in levels if name in together]
    return {
        "levels": alone,
        "pooled": {"levels": listed, "rows": rows, "each": f"may be fewer than {fewest}"},
    }


def _alternative(lock: Lock, other: Alternative, stands: Released) -> Data:
    """A declared alternative: whole where it is on the answer's rows, else whether the answer holds."""
    told: Data = {"changes": other.changes, "status": other.status, "holds": other.holds}
    if not stands.alternative(lock, other):
        return told | {"differences": len(other.differences), "left_out": "it may be on other rows"}
    # With a few rows in the answer, how far a coefficient moves is about them.
    return told | {
        "differences": len(other.differences) if stands.tied else list(other.differences),
        "answer": _answer(other, stands),
        **_body(other, stands),
    }
