"""The refresh record, ``NAME.refresh.yaml``: what a refreshed table did to rows, rulings and coefficients."""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping
from dataclasses import asdict, dataclass
from typing import Any

from beforehand.comparing.answers import CoefficientPair, coefficients
from beforehand.comparing.paths import RulingPair, flipped
from beforehand.faults import DataError
from beforehand.lock import Lock
from beforehand.lock.numbers import as_recorded
from beforehand.plan import Plan
from beforehand.plan.yaml_text import yaml_text
from beforehand.refreshing.drift import Drift, drifts
from beforehand.refreshing.oldform import SOURCES, Chow, OldForm, Prediction, old_form
from beforehand.refreshing.rows import RowChanges, row_changes
from beforehand.refreshing.verdict import Judged, broken_contract, judged
from beforehand.running import Trail
from beforehand.sealing.chain import digest_of

HEADER = "# Written by beforehand. Do not edit: the digest on the last line covers every line above it.\n"

_ROWS = re.compile(r" \(rows? .*\)$")


@dataclass(frozen=True, slots=True, kw_only=True)
class MovedCoefficient:
    """One coefficient in both answers.

    Attributes
    ----------
    term : str
    old, new : float or None
        None where that answer does not have it.
    shift_in_old_se : float or None
        New less old in standard errors of the old one.
    from_new_rows, from_gone_rows, from_revised_rows : float or None
        Parts of the shift, in the coefficient's unit; None where the old model cannot be fitted to
        each part of the rows.
    from_other_form : float or None
        What is left: the part of a model that changed.
    """

    term: str
    old: float | None
    new: float | None
    shift_in_old_se: float | None
    from_new_rows: float | None
    from_gone_rows: float | None
    from_revised_rows: float | None
    from_other_form: float | None


@dataclass(frozen=True, slots=True, kw_only=True)
class Refreshed:
    """What a refresh came to.

    Attributes
    ----------
    verdict : str
        ``holds``, ``moved`` or ``broken``.
    reasons : tuple of str
    plan, old, new : str or None
        Digest of the plan's decisions; digests of the locks. ``new`` is None where the table no longer
        keeps the contract.
    old_data, new_data : str or None
        Fingerprints of the tables.
    learned : str
        ``anew`` or ``replay``: whether fills and exponents were learned from the new table.
    rows : RowChanges or None
    drift : tuple of Drift
    prediction : Prediction or None
    chow : Chow or None
    rulings_flipped : tuple of RulingPair
    coefficients : tuple of MovedCoefficient
    lock : Lock or None
        The new lock.
    """

    verdict: str
    reasons: tuple[str, ...]
    plan: str
    old: str
    new: str | None
    old_data: str
    new_data: str | None
    learned: str
    rows: RowChanges | None
    drift: tuple[Drift, ...]
    prediction: Prediction | None
    chow: Chow | None
    rulings_flipped: tuple[RulingPair, ...]
    coefficients: tuple[MovedCoefficient, ...]
    lock: Lock | None


def refreshed(
    plan: Plan, old: Lock, old_trail: Trail, new: Lock, new_trail: Trail, labels: Callable[[str], str]
) -> Refreshed:
    """Hold a run on a refreshed table against the run before.

    Parameters
    ----------
    plan : Plan
    old, new : Lock
    old_trail, new_trail : Trail
        The runs of which they are the record.
    labels : callable
        What stands for a row's label.
    """
    pairs, turned = coefficients(old, new), flipped(old.rulings, new.rulings)
    form = old_form(old_trail, new_trail)
    verdict = judged(plan, old, new, pairs, turned)
    return Refreshed(
        verdict=verdict.verdict,
        reasons=verdict.reasons,
        plan=new.plan.decisions,
        old=old.digest,
        new=new.digest,
        old_data=old.data.fingerprint,
        new_data=new.data.fingerprint,
        learned=plan.refresh.learned,
        rows=_labelled(row_changes(old_trail.table, new_trail.table), labels),
        drift=drifts(plan, old_trail.table, new_trail.table),
        prediction=None if form is None else form.prediction,
        chow=None if form is None else form.chow,
        rulings_flipped=turned,
        coefficients=tuple(_moved(pair, form) for pair in pairs),
        lock=new,
    )


def unkept(plan: Plan, old: Lock, error: DataError) -> Refreshed:
    """The refresh of a table that no longer keeps the plan's contract.

    Raises
    ------
    DataError
        As given, where something else is wrong with the table.
    """
    verdict = broken_contract(error.faults)
    if verdict is None:
        raise error
    if plan.data.labels_in_lock == "hashed":
        verdict = Judged(
            verdict=verdict.verdict,
            reasons=tuple(_ROWS.sub("", reason.removesuffix(".")) + "." for reason in verdict.reasons),
        )
    return Refreshed(
        verdict=verdict.verdict, reasons=verdict.reasons, plan=old.plan.decisions, old=old.digest, new=None,
        old_data=old.data.fingerprint, new_data=None, learned=plan.refresh.learned, rows=None, drift=(),
        prediction=None, chow=None, rulings_flipped=(), coefficients=(), lock=None,
    )  # fmt: skip


def refresh_text(found: Refreshed) -> str:
    """The record as text: LF line ends, its digest on the last line; the same refresh gives the same text."""
    record = _recorded(as_mapping(found))
    record["digest"] = digest_of(record)
    return HEADER + yaml_text(record)


def as_mapping(found: Refreshed) -> dict[str, Any]:
    """A refresh as plain data, in the order of its record."""
    return {
        "refresh": 1,
        "verdict": found.verdict,
        "reasons": list(found.reasons),
        "plan": found.plan,
        "old": {"lock": found.old, "data": found.old_data},
        "new": {"lock": found.new, "data": found.new_data},
        "learned": found.learned,
        "rows": None
        if found.rows is None
        else {
            "new": list(found.rows.new),
            "gone": list(found.rows.gone),
            "revised": list(found.rows.revised),
            "same": list(found.rows.same),
            "matched_by": found.rows.matched_by,
        },
        "drift": [asdict(one) for one in found.drift],
        "prediction": None if found.prediction is None else asdict(found.prediction),
        "chow": None if found.chow is None else asdict(found.chow),
        "rulings_flipped": [_flip(pair) for pair in found.rulings_flipped],
        "coefficients": [asdict(one) for one in found.coefficients],
    }


def _flip(pair: RulingPair) -> dict[str, Any]:
    either = pair.either
    return {
        "step": either.step,
        "subject": either.subject,
        "old": None
        if pair.old is None
        else {"id": pair.old.id, "verdict": pair.old.verdict, "says": pair.old.says},
        "new": None
        if pair.new is None
        else {"id": pair.new.id, "verdict": pair.new.verdict, "says": pair.new.says},
    }


def _moved(pair: CoefficientPair, form: OldForm | None) -> MovedCoefficient:
    """A coefficient with the parts of its shift."""
    shares: Mapping[str, float] = {} if form is None else form.shares.get(pair.term, {})
    parts = [shares.get(source) for source in SOURCES]
    rest = None
    if pair.old is not None and pair.new is not None and shares:
        rest = (pair.new - pair.old) - sum(part for part in parts if part is not None)
        # Rounding of the two locks' digits is no part of a model.
        if abs(rest) <= 1e-8 * max(abs(pair.old), abs(pair.new)):
            rest = 0.0
    return MovedCoefficient(
        term=pair.term, old=pair.old, new=pair.new, shift_in_old_se=pair.shift, from_new_rows=parts[0],
        from_gone_rows=parts[1], from_revised_rows=parts[2], from_other_form=rest,
    )  # fmt: skip


def _labelled(rows: RowChanges, labels: Callable[[str], str]) -> RowChanges:
    """Row lists with what stands for a label."""
    return RowChanges(
        new=tuple(map(labels, rows.new)), gone=tuple(map(labels, rows.gone)),
        revised=tuple(map(labels, rows.revised)), same=tuple(map(labels, rows.same)),
        matched_by=rows.matched_by,
    )  # fmt: skip


def _recorded(value: Any) -> Any:
    """Numbers as they are recorded, tuples as lists."""
    if isinstance(value, float):
        return as_recorded(value)
    if isinstance(value, Mapping):
        return {key: _recorded(item) for key, item in value.items()}
    if isinstance(value, list | tuple):
        return [_recorded(item) for item in value]
    return value
