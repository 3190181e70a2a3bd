"""From a run to its lock: only what steps returned and benches kept goes in, and all of it does."""

from __future__ import annotations

import hashlib
import platform
from collections.abc import Callable, Mapping
from importlib.metadata import version
from typing import Any

import numpy as np
import scipy
from numpy.typing import NDArray

from beforehand import wording
from beforehand.answer import answer_of, owners_of, shown_exponent, term_name, transform_of
from beforehand.lock import (
    Alternative,
    Answer,
    DataRecord,
    Environment,
    FitOutcome,
    FitRecord,
    FitRows,
    FitTerm,
    FitTest,
    LearnedRecord,
    LedgerStage,
    Lock,
    PlanRecord,
    PredictorFate,
    RowRemoved,
    RulingRecord,
    SealRecord,
)
from beforehand.plan import Plan, decisions_digest, whole_digest, written_out
from beforehand.record.alternatives import differences_from
from beforehand.record.checks import checks_of
from beforehand.record.pictures import pictures_of
from beforehand.record.prediction import prediction_of
from beforehand.running import Trail
from beforehand.steps.keeping import product_name
from beforehand.steps.learned import NOTHING, Learned
from beforehand.steps.records import RecordedFit
from beforehand.steps.rulings import Ruling
from beforehand.steps.state import IDENTITY, Rows
from beforehand.version import __version__

Labels = Callable[[str], str]

UNSEALED = SealRecord(state="unsealed", changes=())


def lock_of(
    trail: Trail,
    alternatives: Mapping[str, Trail],
    *,
    file: str,
    labels: Labels = str,
    seal: SealRecord = UNSEALED,
    sealed: Trail | None = None,
) -> Lock:
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
    seal : SealRecord
        How the plan stands to its seals.
    sealed : Trail, optional
        The run of the plan as first sealed, beside an amended one.
    """
    plan, table = trail.plan, trail.table
    answer = _answer(trail, labels)
    return Lock(
        lock=1,
        plan=_plan(plan, file),
        seal=seal,
        data=DataRecord(
            file=table.file,
            fingerprint=table.fingerprint,
            rows=table.ledger[0].rows,
            labelled=table.labelled,
            labels=plan.data.labels_in_lock,
        ),
        learned=_learned(trail),
        status=_status(trail),
        answer=answer,
        sealed_answer=None if sealed is None else _answer(sealed, labels),
        sealed_plan=None if sealed is None else _plan(sealed.plan, file),
        **_body(trail, labels),
        prediction=prediction_of(trail),
        alternatives={
            name: _alternative(other, plan.alternatives[name], trail, answer, labels)
            for name, other in alternatives.items()
        },
        pictures=pictures_of(trail),
        environment=environment(),
        digest="",
    )


def environment() -> Environment:
    """What a record is made with: this program, Python and the libraries of numbers."""
    return Environment(
        beforehand=__version__,
        python=platform.python_version(),
        numpy=np.__version__,
        scipy=scipy.__version__,
        # Asked of the installation, since importing either takes longer than most runs.
        pandas=version("pandas"),
        statsmodels=version("statsmodels"),
    )


def _plan(plan: Plan, file: str) -> PlanRecord:
    """A plan with its digests and all defaults written out."""
    return PlanRecord(
        file=file,
        title=plan.title,
        question=plan.question,
        decisions=decisions_digest(plan),
        whole=whole_digest(plan),
        written=written_out(plan),
    )


def _answer(trail: Trail, labels: Labels) -> Answer | None:
    """The answer; where its sentence of the nearest ruling names a row, the label as the plan lets it."""
    answer = answer_of(trail)
    if answer is None or answer.fragility is None:
        return answer
    nearest = next(ruling for ruling in trail.rulings if ruling.id == answer.fragility.ruling)
    says = _with_label(answer.fragility.says, nearest, labels)
    return answer.model_copy(update={"fragility": answer.fragility.model_copy(update={"says": says})})


def _is_about_a_row(ruling: Ruling) -> bool:
    """Whether the subject of a ruling is a row."""
    return ruling.ground.startswith("row_") or ruling.ground == "cap_reached"


def _with_label(says: str, ruling: Ruling, labels: Labels) -> str:
    """A sentence about a ruling in which a row's label stands as the plan lets it."""
    if not _is_about_a_row(ruling):
        return says
    return says.replace(f"ow {ruling.subject} ", f"ow {labels(ruling.subject)} ")


def _learned(trail: Trail) -> LearnedRecord | None:
    """What the run took from an earlier one; the outcome goes by its column here."""
    if not trail.learned.fills and not trail.learned.exponents:
        return None
    return LearnedRecord(
        fills=dict(trail.learned.fills),
        exponents={name or trail.plan.outcome.column: e for name, e in trail.learned.exponents.items()},
    )


def learned_from(lock: Lock) -> Learned:
    """What a lock's run learned, to be used again.

    Fills by regression are not among it: their coefficients are not in the record.
    """
    exponents = {
        name: fate.exponent
        for name, fate in lock.predictors.items()
        if fate.transform == "box_cox" and fate.exponent is not None
    }
    if lock.answer is not None and lock.answer.outcome.exponent is not None:
        exponents[""] = lock.answer.outcome.exponent
    return Learned(
        fills={
            fill.predictor: fill.value
            for fill in lock.checks.fills
            if fill.method in ("mean", "median", "most_common") and fill.value is not None
        },
        exponents=exponents,
    )


def learned_in(lock: Lock) -> Learned:
    """What a lock's run did not learn anew itself."""
    if lock.learned is None:
        return NOTHING
    outcome = str(lock.plan.written["outcome"]["column"])  # type: ignore[index,call-overload]
    return Learned(
        fills=lock.learned.fills,
        exponents={"" if name == outcome else name: e for name, e in lock.learned.exponents.items()},
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
        "checks": checks_of(trail, labels),
    }


def _alternative(
    other: Trail, changes: Mapping[str, Any], main: Trail, main_answer: Answer | None, labels: Labels
) -> Alternative:
    """The same run under declared changes, held against the main answer."""
    answer = _answer(other, labels)
    differences = differences_from(main, main_answer, other, answer)
    return Alternative(
        changes=changes,
        status=_status(other),
        answer=answer,
        **_body(other, labels),
        holds=not differences and other.status != "stopped",
        differences=differences,
    )


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
    subject = labels(ruling.subject) if _is_about_a_row(ruling) else ruling.subject
    says = _with_label(wording.sentence(ruling), ruling, labels)
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


def _why(why: str, labels: Labels) -> str:
    """What a fit was asked for; a row that it leaves out is named as the plan lets it."""
    start = "without row "
    return start + labels(why.removeprefix(start)) if why.startswith(start) else why


def _fit(recorded: RecordedFit, trail: Trail, digests: _RowDigests) -> FitRecord:
    """One fit with its coefficients and the test of each predictor."""
    fit, model = recorded.fit, recorded.model
    terms: list[FitTerm] = []
    for predictor, coefficient in zip(owners_of(model), fit.coefficients, strict=True):
        rung, exponent, level = transform_of(coefficient.key)
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
        why=_why(recorded.why, digests.labels),
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
    """Digests of row sets: of the labels of the rows in use, in canonical order, one to a line."""

    def __init__(self, trail: Trail, labels: Labels) -> None:
        self._source = trail.source
        self.labels = labels
        self._lines: NDArray[np.object_] | None = None
        self._known: dict[Rows, str] = {}

    def of(self, rows: Rows) -> str:
        """The digest of a set of rows, whatever the order in which they are named."""
        known = self._known.get(rows)
        if known is None:
            if self._lines is None:
                self._lines = np.array(list(map(self.labels, self._source.labels())), dtype=object)
            lines = self._lines if not rows.gone else np.delete(self._lines, rows.gone)
            text = "\n".join(lines.tolist())
            if "\\" in text or text.count("\n") >= max(1, len(lines)):
                # A label with a line break in it is still one line.
                text = "\n".join(_on_one_line(label) for label in lines.tolist())
            known = self._known[rows] = f"sha256:{hashlib.sha256(text.encode()).hexdigest()}"
        return known


def _on_one_line(label: str) -> str:
    return label.replace("\\", "\\\\").replace("\n", "\\n")
