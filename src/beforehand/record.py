"""From a run to its lock: only what steps returned and benches kept goes in, and all of it does."""

from __future__ import annotations

import hashlib
import platform
from collections.abc import Callable, Iterable, Mapping
from typing import Any

import numpy as np
import scipy

from beforehand import wording
from beforehand.answer import answer_of, shown_exponent, term_name, transform_of
from beforehand.fit.descriptives import describe
from beforehand.lock import (
    Alternative,
    Answer,
    AssumptionCheck,
    Checks,
    Condition,
    Correlation,
    DataRecord,
    Descriptive,
    Environment,
    FillRecord,
    FitOutcome,
    FitRecord,
    FitRows,
    FitTerm,
    FitTest,
    Inflation,
    InfluenceRow,
    JointComparison,
    LedgerStage,
    Lock,
    MissingRecord,
    PlanRecord,
    PredictorFate,
    RowRemoved,
    RulingRecord,
    SealRecord,
)
from beforehand.plan import Plan, decisions_digest, whole_digest, written_out
from beforehand.running import Trail
from beforehand.steps.bench import Checked
from beforehand.steps.influence import InfluenceRecord, KeptRow
from beforehand.steps.keeping import product_name
from beforehand.steps.recording import RecordedCheck, RecordedFit, column_name
from beforehand.steps.rulings import Ruling
from beforehand.steps.state import IDENTITY, Rows
from beforehand.table import Column, Table
from beforehand.version import __version__

Labels = Callable[[str], str]


def lock_of(trail: Trail, alternatives: Mapping[str, Trail], *, file: str, labels: Labels = str) -> Lock:
    """The lock of a run and its declared alternatives.

    Parameters
    ----------
    trail : Trail
    alternatives : mapping of name to Trail
        In plan order.
    file : str
        Name of the plan's file, without a folder.
    labels : callable
        What stands for a row's label: the label, or a keyed hash of it.
    """
    plan, table = trail.plan, trail.table
    answer = answer_of(trail)
    return Lock(
        lock=1,
        plan=PlanRecord(
            file=file,
            title=plan.title,
            question=plan.question,
            decisions=decisions_digest(plan),
            whole=whole_digest(plan),
            written=written_out(plan),
        ),
        seal=SealRecord(state="unsealed", changes=()),
        data=DataRecord(
            file=table.file,
            fingerprint=table.fingerprint,
            rows=table.ledger[0].rows,
            labelled=table.labelled,
            labels=plan.data.labels_in_lock,
        ),
        status=_status(trail),
        answer=answer,
        **_body(trail, labels),
        alternatives={
            name: _alternative(other, plan.alternatives[name], trail, answer, labels)
            for name, other in alternatives.items()
        },
        environment=Environment(
            beforehand=__version__,
            python=platform.python_version(),
            numpy=np.__version__,
            scipy=scipy.__version__,
        ),
        digest="",
    )


def _status(trail: Trail) -> Any:
    """The status, which the lock's model narrows to its four words."""
    return trail.status


def _body(trail: Trail, labels: Labels) -> dict[str, Any]:
    """What a run and an alternative both put in the record, in its order."""
    digests = _RowDigests(trail, labels)
    return {
        "ledger": _ledger(trail),
        "rows_removed": tuple(
            RowRemoved(row=labels(row.label), step=row.step, ruling=row.ruling)
            for row in trail.state.row_departures
        ),
        "predictors": _fates(trail),
        "rulings": tuple(_ruling(ruling, trail, labels) for ruling in trail.rulings),
        "fits": tuple(_fit(fit, trail, digests) for fit in trail.bench.record.fits),
        "checks": _checks(trail, labels),
    }


def _alternative(
    other: Trail, changes: Mapping[str, Any], main: Trail, main_answer: Answer | None, labels: Labels
) -> Alternative:
    """The same run under declared changes, held against the main answer."""
    answer = answer_of(other)
    differences = differences_from(main, main_answer, other, answer)
    return Alternative(
        changes=changes,
        status=_status(other),
        answer=answer,
        **_body(other, labels),
        holds=not differences and other.status != "stopped",
        differences=differences,
    )


def differences_from(
    main: Trail, main_answer: Answer | None, other: Trail, answer: Answer | None
) -> tuple[str, ...]:
    """What makes another answer a different one, by the plan's own tolerances.

    The status, the predictors adopted, a sign, or a coefficient that moves by more than
    ``refresh.coefficient`` standard errors of the main answer.
    """
    found: list[str] = []
    if main.status != other.status:
        found.append(f"The status is {other.status}, not {main.status}.")
    if main_answer is None or answer is None:
        return tuple(found)
    here = {term.term: term for term in main_answer.terms if term.predictor is not None}
    there = {term.term: term for term in answer.terms if term.predictor is not None}
    found += [f"{name} is no longer in the model." for name in here if name not in there]
    found += [f"{name} comes into the model." for name in there if name not in here]
    limit = main.plan.refresh.coefficient
    for name, term in here.items():
        if name not in there or there[name].transform != term.transform:
            continue
        now = there[name].coefficient
        if now * term.coefficient < 0:
            found.append(f"The sign of {name} changes.")
        elif term.standard_error and abs(now - term.coefficient) > limit * term.standard_error:
            moved = abs(now - term.coefficient) / term.standard_error
            found.append(
                f"{name} moves by {wording.number(moved)} standard errors, limit {wording.number(limit)}."
            )
    return tuple(found)


def _ledger(trail: Trail) -> tuple[LedgerStage, ...]:
    """Rows at each stage, from the file to the answer."""
    stages = [
        LedgerStage(stage=stage.name, rows=stage.rows, because=stage.because)
        for stage in trail.table.ledger
        if stage.name != "with an outcome"
    ]
    stages.append(LedgerStage(stage="with an outcome", rows=trail.base.with_outcome, because=None))
    stages.append(LedgerStage(stage="complete", rows=len(trail.base.kept), because=None))
    left = len(trail.base.kept)
    for row in trail.state.row_departures:
        if row.step != "missing_data":
            left -= 1
            stages.append(LedgerStage(stage=f"after {row.ruling}", rows=left, because=None))
    stages.append(LedgerStage(stage="in use", rows=left, because=None))
    return tuple(stages)


def _fates(trail: Trail) -> dict[str, PredictorFate]:
    """How each predictor ended, in plan order."""
    plan, state = trail.plan, trail.state
    by_id = {ruling.id: ruling for ruling in trail.rulings}
    left = {departure.predictor: departure for departure in state.departures}
    fates: dict[str, PredictorFate] = {}
    names = [p.column for p in plan.predictors] + [product_name(parts) for parts in plan.products]
    for name in names:
        transform = state.transforms.get(name, IDENTITY)
        rung = None if transform == IDENTITY else transform.rung
        if name in left:
            ruling = by_id[left[name].ruling]
            about = wording.sentence(ruling)
            says = about if ruling.subject == name else f"{name} leaves: {about}"
            verdict: Any = "removed"
            number: str | None = ruling.id
        else:
            verdict = "adopted" if trail.status == "adopted" else "in_model"
            last = next((r for r in reversed(trail.rulings) if _ends(r, name)), None)
            number = None if last is None else last.id
            says = f"{name} is in the model." if last is None else wording.sentence(last)
        fates[name] = PredictorFate(
            verdict=verdict, ruling=number, transform=rung, exponent=shown_exponent(transform), says=says
        )
    return fates


def _ends(ruling: Ruling, name: str) -> bool:
    """Whether a ruling says why a predictor is in the final model."""
    return ruling.subject == name and (
        ruling.ground in ("stays", "stays_above_alpha", "near_miss") or ruling.ground.startswith("kept_")
    )


def _ruling(ruling: Ruling, trail: Trail, labels: Labels) -> RulingRecord:
    """A ruling with its sentence; a row's label stands as the plan lets it."""
    is_row = ruling.ground.startswith("row_") or ruling.ground == "cap_reached"
    subject = labels(ruling.subject) if is_row else ruling.subject
    says = wording.sentence(ruling)
    if is_row and subject != ruling.subject:
        says = says.replace(f"ow {ruling.subject} ", f"ow {subject} ")
    return RulingRecord(
        id=ruling.id,
        step=ruling.step,
        clause=ruling.clause,
        subject=subject,
        fits=ruling.fits,
        checks=ruling.checks,
        evidence=ruling.evidence,
        limit=None if ruling.limit is None else float(ruling.limit),
        margin=ruling.margin,
        knife_edge=ruling.knife_edge,
        verdict=wording.verdict_of(ruling.ground),
        ground=ruling.ground,
        because=ruling.because,
        says=says,
    )


def _fit(recorded: RecordedFit, trail: Trail, digests: _RowDigests) -> FitRecord:
    """One fit with its coefficients and the test of each predictor."""
    fit, model = recorded.fit, recorded.model
    terms: list[FitTerm] = []
    for coefficient in fit.coefficients:
        predictor, rung, exponent, level = transform_of(model, coefficient.key)
        terms.append(
            FitTerm(
                term=term_name(coefficient.key),
                predictor=predictor,
                transform=rung,
                exponent=exponent,
                level=level,
                coefficient=coefficient.estimate,
                standard_error=coefficient.standard_error,
                t=coefficient.t,
                p=coefficient.p,
            )
        )
    factor = model.outcome.factors[0]
    return FitRecord(
        id=recorded.id,
        step=recorded.step,
        why=recorded.why,
        rows=FitRows(n=fit.n, digest=digests.of(model.rows)),
        outcome=FitOutcome(
            column=factor.column,
            transform=factor.rung,
            exponent=factor.exponent if factor.rung == "box_cox" else None,
        ),
        errors=fit.errors,
        terms=tuple(terms),
        tests=tuple(
            FitTest(predictor=name, df=test.df, statistic=test.statistic, p=test.p)
            for name, test in fit.tests.items()
        ),
        r_squared=fit.r_squared,
        adjusted_r_squared=fit.adjusted_r_squared,
        residual_sd=fit.residual_sd,
        f=fit.f,
        f_df=fit.f_df if model.terms else None,
        f_p=fit.f_p,
        aic=fit.aic,
        bic=fit.bic,
        exact=fit.exact,
    )


class _RowDigests:
    """Digests of row sets: the sum of the rows' own digests, so that one row less is one subtraction."""

    _MODULUS = 1 << 256

    def __init__(self, trail: Trail, labels: Labels) -> None:
        self._source = trail.source
        self._labels = labels
        self._total: int | None = None
        self._known: dict[Rows, str] = {}

    def of(self, rows: Rows) -> str:
        """The digest of a set of rows, whatever the order in which they are named."""
        known = self._known.get(rows)
        if known is None:
            if self._total is None:
                self._total = sum(map(self._row, self._source.labels()))
            left = self._total - sum(self._row(self._source.label(position)) for position in rows.gone)
            known = self._known[rows] = f"sha256:{left % self._MODULUS:064x}"
        return known

    def _row(self, label: str) -> int:
        return int.from_bytes(hashlib.sha256(self._labels(label).encode()).digest(), "big")


def _checks(trail: Trail, labels: Labels) -> Checks:
    """Descriptives, collinearity, assumption checks and influence, by stage."""
    record = trail.bench.record
    found = record.tables.get("influence")
    influence = found if isinstance(found, InfluenceRecord) else None
    return Checks(
        descriptives=tuple(_descriptives(trail)),
        missing=tuple(
            MissingRecord(
                predictor=one.predictor,
                missing=one.missing,
                share=one.share,
                rows_left=one.rows_left,
                standardized_difference=one.standardized_difference,
            )
            for one in trail.base.missing
            if one.missing
        ),
        fills=tuple(
            FillRecord(
                predictor=fill.predictor, method=fill.method, value=fill.shown, cells=len(fill.positions)
            )
            for fill in trail.base.fills
        ),
        correlations=tuple(
            Correlation(stage=one.stage, first=first, second=second, r=r)
            for one in record.collinearity
            for first, second, r in one.correlations
        ),
        inflation=tuple(
            Inflation(stage=one.stage, predictor=name, vif=vif)
            for one in record.collinearity
            for name, vif in one.inflation
        ),
        condition=tuple(
            Condition(
                stage=one.stage,
                index=index,
                shares={
                    column_name(key): float(share)
                    for key, share in zip(one.condition.keys, shares, strict=True)
                },
            )
            for one in record.collinearity
            for index, shares in zip(one.condition.indices, one.condition.shares, strict=True)
        ),
        assumptions=tuple(_check(check) for check in record.checks),
        influence=tuple(_influence_rows(influence, trail.plan, labels)) if influence else (),
        jointly_without_flagged=_joint(influence),
    )


def _check(recorded: RecordedCheck) -> AssumptionCheck:
    """One assumption check with what came out."""
    check = recorded.check
    made = Checked(recorded.id, check, recorded.alpha, recorded.fit)
    verdict: Any = "not_applicable" if check.statistic is None else ("failed" if made.failed else "passed")
    return AssumptionCheck(
        id=recorded.id,
        stage=recorded.stage,
        check=check.name,
        subject=recorded.subject,
        fit=recorded.fit,
        statistic=check.statistic,
        df=check.df,
        p=check.p,
        alpha=recorded.alpha,
        verdict=verdict,
        because=check.not_applicable or None,
    )


def _descriptives(trail: Trail) -> Iterable[Descriptive]:
    """The outcome and every predictor, as read, among the eligible rows."""
    units = {p.column: p.unit for p in trail.plan.predictors}
    units[trail.plan.outcome.column] = trail.plan.outcome.unit
    for name in (trail.plan.outcome.column, *(p.column for p in trail.plan.predictors)):
        yield _descriptive(trail.table.columns[name], units[name], trail.table)


def _descriptive(column: Column, unit: str | None, table: Table) -> Descriptive:
    """One column: moments and quartiles of a number, counts of a category's levels."""
    if column.kind == "number":
        seen = describe(column.values)
        return Descriptive(
            column=column.name, kind="number", unit=unit, n=seen.n, missing=seen.missing, mean=seen.mean,
            sd=seen.sd, minimum=seen.minimum, lower_quartile=seen.lower_quartile, median=seen.median,
            upper_quartile=seen.upper_quartile, maximum=seen.maximum, skewness=seen.skewness,
            kurtosis=seen.kurtosis, levels={},
        )  # fmt: skip
    codes = column.values[column.values >= 0].astype(np.int64)
    counts = np.bincount(codes, minlength=len(column.levels))
    return Descriptive(
        column=column.name, kind="category", unit=unit, n=len(codes), missing=table.n_rows - len(codes),
        mean=None, sd=None, minimum=None, lower_quartile=None, median=None, upper_quartile=None,
        maximum=None, skewness=None, kurtosis=None,
        levels={level: int(count) for level, count in zip(column.levels, counts, strict=True)},
    )  # fmt: skip


def _influence_rows(found: InfluenceRecord, plan: Plan, labels: Labels) -> Iterable[InfluenceRow]:
    """Rows that left, then flagged rows that stayed, as many one by one as the plan records."""
    for row, ruling in found.removed:
        yield _influence_row(row, ruling, labels, stays=False)
    for row in found.kept[: plan.influence.record_at_most]:
        yield _influence_row(row, found.kept_ruling, labels, stays=True)


def _influence_row(row: KeptRow, ruling: str | None, labels: Labels, *, stays: bool) -> InfluenceRow:
    """One flagged row with what leaving it out changes."""
    measures, comparison = row.measures, row.comparison
    return InfluenceRow(
        row=labels(row.label),
        ruling=ruling,
        leverage=measures.get("leverage"),
        studentized_residual=measures.get("studentized_residual"),
        cooks_distance=measures.get("cooks_distance"),
        dffits=measures.get("dffits"),
        change_r_squared=comparison.change_r_squared,
        change_coefficient=comparison.change_coefficient,
        of=comparison.of or None,
        significance_changes=comparison.significance_changes,
        sign_changes=comparison.sign_changes,
        stays=stays,
    )


def _joint(found: InfluenceRecord | None) -> JointComparison | None:
    """All flagged rows that stayed, left out together."""
    if found is None or found.joint is None:
        return None
    rows, fitted, change_r_squared, change_coefficient, of = found.joint
    return JointComparison(
        rows=rows,
        fit=fitted.id,
        change_r_squared=change_r_squared,
        change_coefficient=change_coefficient,
        of=of or None,
    )
