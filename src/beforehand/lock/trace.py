"""Telling the whole story of one predictor or one row from the lock alone."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence

from beforehand.faults import Fault, LockError, NumericalError, did_you_mean
from beforehand.lock.checks import InfluenceRow
from beforehand.lock.models import Alternative, Lock
from beforehand.lock.story import Entry, Flag, InAlternative, Role, Standing, Story
from beforehand.lock.trail import FitRecord, FitTerm, RulingRecord

__all__ = ["Story", "trace"]

ROW_PREFIX = "row:"

# Under this name a product stands in rulings and fits.
PRODUCT_SIGN = " × "

# Rulings on rows rest on this block of the plan; rulings of the same step on predictors do not.
_ROW_CLAUSES = "influence"

# The ruling whose subject is a pair of predictors.
_OF_A_PAIR = "joint_signal"

_MEASURES = ("cooks_distance", "leverage", "studentized_residual", "dffits")


def trace(lock: Lock, subject: str) -> Story:
    """Tell everything that a lock holds about one predictor or row.

    Parameters
    ----------
    lock : Lock
        The lock; no table is needed.
    subject : str
        A predictor, a product (``outdoor_temp × load``), a level's term, the outcome, or the label
        of a row that was flagged or removed. A predictor goes before a row of the same name;
        ``row:LABEL`` is always a row.

    Returns
    -------
    Story
        Its rulings in the order of the run, the fits in which it stood, and how it ended.

    Raises
    ------
    LockError
        The lock holds nothing of this name; the nearest name is told.
    """
    labels = _labels(lock)
    if subject.startswith(ROW_PREFIX):
        label = subject.removeprefix(ROW_PREFIX)
        if label in labels:
            return _of_row(lock, label)
    elif subject in lock.predictors:
        return _of_predictor(lock, subject)
    elif subject == _outcome(lock):
        return _of_outcome(lock, subject)
    elif subject in labels:
        return _of_row(lock, subject)
    elif (owner := _owner_of_term(lock, subject)) is not None:
        return _of_predictor(lock, owner)
    raise _unknown(lock, subject, labels)


def _of_predictor(lock: Lock, name: str) -> Story:
    """Tell the story of a predictor or a product."""
    fate = lock.predictors[name]
    pairs = _pairs(lock)
    parts = next((pair for pair in pairs if PRODUCT_SIGN.join(pair) == name), ())
    fits = {fit.id: fit for fit in lock.fits}
    entries = []
    for ruling in lock.rulings:
        role = _role(ruling, name, parts, decided=ruling.id == fate.ruling)
        if role is not None:
            standings = [_standing(fits[number], name) for number in ruling.fits if number in fits]
            entries.append(_entry(ruling, role, [one for one in standings if one is not None]))
    return Story(
        subject=name,
        kind="predictor",
        verdict=fate.verdict,
        ruling=fate.ruling,
        says=fate.says,
        transform=fate.transform,
        parts=parts,
        products=tuple(PRODUCT_SIGN.join(pair) for pair in pairs if name in pair),
        groups=_groups(lock, name),
        entries=tuple(entries),
        fits=tuple(one for fit in lock.fits if (one := _standing(fit, name)) is not None),
        measures=None,
        flags=(),
        alternatives=tuple(
            InAlternative(alternative=other, verdict=end.verdict, says=end.says)
            for other, run in lock.alternatives.items()
            if (end := run.predictors.get(name)) is not None
        ),
    )


def _of_outcome(lock: Lock, name: str) -> Story:
    """Tell the story of the outcome's scale."""
    transform = lock.answer.outcome.transform if lock.answer is not None else "identity"
    entries = tuple(_entry(ruling, "subject", ()) for ruling in lock.rulings if ruling.subject == name)
    last = entries[-1] if entries else None
    return Story(
        subject=name,
        kind="outcome",
        verdict=transform,
        ruling=None if last is None else last.ruling,
        says=f"{name} is fitted as it was read." if last is None else last.says,
        transform=None if transform == "identity" else transform,
        parts=(),
        products=(),
        groups=(),
        entries=entries,
        fits=(),
        measures=None,
        flags=(),
        alternatives=tuple(
            InAlternative(
                alternative=other,
                verdict=run.answer.outcome.transform,
                says=f"{name} is fitted on the scale {run.answer.outcome.transform}.",
            )
            for other, run in lock.alternatives.items()
            if run.answer is not None
        ),
    )


def _of_row(lock: Lock, label: str) -> Story:
    """Tell the story of a row that was flagged or removed."""
    measures = next((row for row in lock.checks.influence if row.row == label), None)
    removed = next((row for row in lock.rows_removed if row.row == label), None)
    decided = removed.ruling if removed is not None else measures.ruling if measures is not None else None
    fits = {fit.id: fit for fit in lock.fits}
    of = measures.of if measures is not None else None
    entries = [
        _entry(ruling, "subject", [_fit_of_row(fits[number], of) for number in ruling.fits if number in fits])
        for ruling in lock.rulings
        if ruling.id == decided or (ruling.subject == label and ruling.clause.startswith(_ROW_CLAUSES))
    ]
    says = next((entry.says for entry in entries if entry.ruling == decided), f"{label} stays.")
    return Story(
        subject=label,
        kind="row",
        verdict="stays" if removed is None else "removed",
        ruling=decided,
        says=says,
        transform=None,
        parts=(),
        products=(),
        groups=(),
        entries=tuple(entries),
        fits=(),
        measures=measures,
        flags=() if measures is None else tuple(_flags(lock, measures, entries)),
        alternatives=tuple(_row_in(other, run, label) for other, run in lock.alternatives.items()),
    )


def _row_in(name: str, run: Alternative, label: str) -> InAlternative:
    """How a row ended in an alternative."""
    removed = next((row for row in run.rows_removed if row.row == label), None)
    if removed is None:
        return InAlternative(alternative=name, verdict="stays", says=f"{label} stays.")
    says = next((ruling.says for ruling in run.rulings if ruling.id == removed.ruling), f"{label} leaves.")
    return InAlternative(alternative=name, verdict="removed", says=says)


def _role(ruling: RulingRecord, name: str, parts: Sequence[str], *, decided: bool) -> Role | None:
    """Say what a ruling has to do with a predictor; None for nothing."""
    if ruling.clause.startswith(_ROW_CLAUSES):
        return None
    if ruling.subject == name:
        return "subject"
    evidence = ruling.evidence
    if evidence.get("partner") == name:
        return "partner"
    in_pair = ruling.subject.startswith(f"{name}, ") or ruling.subject.endswith(f", {name}")
    if in_pair and ruling.ground == _OF_A_PAIR:
        return "partner"
    if decided:
        return "part" if ruling.subject in parts else "member"
    determines = f"weight of {name}"
    if determines in evidence or any(key.startswith(f"{determines} = ") for key in evidence):
        return "member"
    return "member" if ruling.because == name else None


def _entry(ruling: RulingRecord, role: Role, fits: Sequence[Standing]) -> Entry:
    """One ruling as an entry of the story."""
    return Entry(
        ruling=ruling.id,
        step=ruling.step,
        clause=ruling.clause,
        verdict=ruling.verdict,
        role=role,
        subject=ruling.subject,
        says=ruling.says,
        evidence=ruling.evidence,
        limit=ruling.limit,
        margin=ruling.margin,
        knife_edge=ruling.knife_edge,
        because=ruling.because,
        fits=tuple(fits),
    )


def _standing(fit: FitRecord, name: str) -> Standing | None:
    """How a predictor stood in a fit; None where it was not in it."""
    terms = tuple(term for term in fit.terms if term.predictor == name)
    if not terms:
        return None
    test = next((test for test in fit.tests if test.predictor == name), None)
    return Standing(
        fit=fit.id,
        step=fit.step,
        why=fit.why,
        rows=fit.rows.n,
        terms=terms,
        statistic=None if test is None else test.statistic,
        p=None if test is None else test.p,
        r_squared=fit.r_squared,
    )


def _fit_of_row(fit: FitRecord, of: str | None) -> Standing:
    """Show a fit with or without a row, with the coefficient that the row moves most."""
    terms: tuple[FitTerm, ...] = tuple(term for term in fit.terms if of in (term.term, term.predictor))
    return Standing(
        fit=fit.id,
        step=fit.step,
        why=fit.why,
        rows=fit.rows.n,
        terms=terms if of is not None else (),
        statistic=None,
        p=None,
        r_squared=fit.r_squared,
    )


def _flags(lock: Lock, measures: InfluenceRow, entries: Sequence[Entry]) -> Iterator[Flag]:
    """Each measure of a row beside the limit that flags it, in the fit with the row."""
    # The plan's formulas are asked for only here, so that reading a lock needs no plan.
    from beforehand.plan.limits import Limit

    first = next(
        (entry.fits[0].fit for entry in entries if entry.ruling == measures.ruling and entry.fits), None
    )
    fit = next((fit for fit in lock.fits if fit.id == first), None)
    written = _inside(lock.plan.written, "influence", "flag_when")
    for measure in _MEASURES:
        value = getattr(measures, measure)
        if value is None:
            continue
        limit = written.get(measure) if isinstance(written, Mapping) else None
        number = None
        if fit is not None and isinstance(limit, str | int | float):
            try:
                number = Limit.of(limit).value(fit.rows.n, len(fit.terms))
            except (ValueError, NumericalError):
                # A formula that this version does not know, or that has no value at this size.
                number = None
        yield Flag(
            measure=measure,
            value=value,
            limit=number,
            written=None if limit is None else str(limit),
            flagged=number is not None and abs(value) > number,
        )


def _inside(plan: object, *keys: str) -> object:
    """Take a part of the written plan; None where it has none."""
    for key in keys:
        plan = plan.get(key) if isinstance(plan, Mapping) else None
    return plan


def _outcome(lock: Lock) -> object:
    """Take the outcome's column from the written plan."""
    return _inside(lock.plan.written, "outcome", "column")


def _pairs(lock: Lock) -> tuple[tuple[str, ...], ...]:
    """Take the plan's products, each as its parts."""
    products = _inside(lock.plan.written, "products")
    pairs = products if isinstance(products, tuple) else ()
    return tuple(tuple(str(part) for part in pair) for pair in pairs if isinstance(pair, tuple))


def _groups(lock: Lock, name: str) -> tuple[tuple[str, ...], ...]:
    """List the groups of the keep rules of which a predictor is a member."""
    rules = _inside(lock.plan.written, "keep")
    found = [_inside(rule, "at_least_one_of") for rule in (rules if isinstance(rules, tuple) else ())]
    return tuple(tuple(map(str, group)) for group in found if isinstance(group, tuple) and name in group)


def _owner_of_term(lock: Lock, name: str) -> str | None:
    """Find the predictor to which a term of some fit belongs."""
    owners = (term.predictor for fit in lock.fits for term in fit.terms if term.term == name)
    return next((owner for owner in owners if owner in lock.predictors), None)


def _labels(lock: Lock) -> dict[str, None]:
    """Labels of the rows that a lock names, in its order."""
    named = [row.row for row in lock.rows_removed] + [row.row for row in lock.checks.influence]
    capped = [
        ruling.subject
        for ruling in lock.rulings
        if ruling.ground == "cap_reached" and ruling.clause.startswith(_ROW_CLAUSES)
    ]
    return dict.fromkeys([*named, *capped])


def _unknown(lock: Lock, subject: str, labels: Mapping[str, None]) -> LockError:
    """Make the error of a name that the lock does not hold."""
    if subject.startswith(ROW_PREFIX):
        near = did_you_mean(subject.removeprefix(ROW_PREFIX), labels)
        what = f"is no row that was flagged or removed{near}"
    else:
        near = did_you_mean(subject, [*lock.predictors, *labels])
        what = f"is neither a predictor nor a row that was flagged or removed{near}"
    if lock.data.labels == "hashed":
        what += "; labels of rows stand hashed in this lock"
    fault = Fault(
        file=f"lock of {lock.plan.file}", line=None, place=subject, what=what, code="lock.unknown_subject"
    )
    return LockError([fault])
