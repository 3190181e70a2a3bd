"""Which numbers of a lock may stand at full digits in a copy that gives no row away.

A fit at ten digits gives the sums, squares and products of its columns over its rows. Two fits whose
rows differ by one row therefore give that row, by subtraction. Rounding does not mend it: a row that is
removed for its influence moves coefficients in their first digits, so three digits still tell its
values roughly. Pairs that differ by several rows are no safer where a column is an indicator, since the
sums of each level can be subtracted apart. What is safe is one set of rows: the rows of the answer.
Fits on any other rows are left out whole, the first fit among them, whenever rows left after it.

A column in which fewer than a few rows differ from all others does the same within one fit: its
coefficient takes those rows up, and the other coefficients are those of the fit without them. So a fit
with such a column counts as a fit on other rows than one without it, and where the answer has such a
column, its coefficient, the intercept and whatever needs the outcome's total spread are left out.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Iterator
from dataclasses import dataclass

from beforehand.handing.labels import is_about_a_row
from beforehand.lock import (
    Alternative,
    AssumptionCheck,
    Descriptive,
    FitRecord,
    Lock,
    RulingRecord,
)

# Two ways to the same number by ten recorded digits agree at least as well as this.
_SAME = 1e-6

# A kurtosis below this is that of columns that are merely skewed.
_APART = 20.0

# Blocks of the plan that change no cell and no order of rows that a run reads.
_SAME_CELLS = frozenset(
    {
        "alpha", "collinearity", "final_checks", "influence", "intercept", "keep", "multiplicity",
        "products", "purpose", "selection", "steps", "transforms", "weak_model",
    }
)  # fmt: skip

# The same where rows have labels of their own: without labels, columns that are read in addition may
# number the rows anew.
_SAME_LABELLED = _SAME_CELLS | {"assumptions", "errors"}


@dataclass(frozen=True, slots=True, kw_only=True)
class Released:
    """What may stand.

    Attributes
    ----------
    fewest : int
        Fewer rows than this are never told apart from the rest.
    rows : int or None
        Rows of the answer; None where there is none.
    digest : str or None
        Of those rows.
    every_row : bool
        Whether no row of the base left, so that every stage of the run is on the answer's rows.
    after : frozenset of str
        Stages that are on the answer's rows.
    rare : frozenset of str
        Predictors in which fewer than ``fewest`` rows may differ from the others.
    tied : frozenset of str
        Those of them that are in the answer.
    """

    fewest: int
    rows: int | None
    digest: str | None
    every_row: bool
    after: frozenset[str]
    rare: frozenset[str]
    tied: frozenset[str]

    def fit(self, fit: FitRecord) -> bool:
        """Whether a fit is on the answer's rows, and takes up the same few rows if any."""
        if self.digest is None or fit.rows.digest != self.digest:
            return False
        return self.rare & parts_of(term.predictor for term in fit.terms) == self.tied

    def fits(self, record: Lock | Alternative) -> frozenset[str]:
        """Numbers of the fits that stand."""
        return frozenset(fit.id for fit in record.fits if self.fit(fit))

    def checks(self, record: Lock | Alternative) -> frozenset[str]:
        """Numbers of the checks of assumptions that stand: those of fits that do."""
        stand = self.fits(record)

        def stands(check: AssumptionCheck) -> bool:
            return check.fit in stand and check.subject not in self.rare

        return frozenset(check.id for check in record.checks.assumptions if stands(check))

    def rulings(self, record: Lock | Alternative) -> frozenset[str]:
        """Numbers of the rulings whose evidence stands: on fits and checks that do, about no row."""
        fits, checks = self.fits(record), self.checks(record)

        def stands(ruling: RulingRecord) -> bool:
            told = (ruling.subject, ruling.says, *ruling.evidence)
            return (
                bool(ruling.fits or ruling.checks)
                and fits.issuperset(ruling.fits)
                and checks.issuperset(ruling.checks)
                and ruling.step != "influence"
                and not is_about_a_row(ruling.ground)
                and not any(name in text for name in self.rare for text in told)
            )

        return frozenset(ruling.id for ruling in record.rulings if stands(ruling))

    def stage(self, name: str) -> bool:
        """Whether what is recorded of a stage is on the answer's rows."""
        return self.digest is not None and (self.every_row or name in self.after)

    def described(self, column: Descriptive, filled: bool, fitted: bool) -> bool:
        """Whether moments and counts of a column stand.

        They are over all eligible rows with a value. Beside a fit that holds the column they stand
        where no row left, or enough of them.
        """
        if column.n < self.fewest:
            return False
        if not fitted or self.rows is None:
            return True
        left = column.n - self.rows + (column.missing if filled else 0)
        return left == 0 or left >= self.fewest

    def alternative(self, lock: Lock, other: Alternative) -> bool:
        """Whether a declared alternative is on the very cells of the answer."""
        same = _SAME_LABELLED if lock.data.labelled else _SAME_CELLS
        answer = other.answer
        final = None if answer is None else next((f for f in other.fits if f.id == answer.fit), None)
        return same.issuperset(other.changes) and final is not None and self.fit(final)


def released(lock: Lock, fewest: int) -> Released:
    """What of a lock may stand at full digits."""
    answer = lock.answer
    final = None if answer is None else next((fit for fit in lock.fits if fit.id == answer.fit), None)
    complete = next((stage.rows for stage in lock.ledger if stage.stage == "complete"), None)
    rare: frozenset[str] = frozenset()
    tied: frozenset[str] = frozenset()
    if final is not None:
        rare = frozenset(_rare(lock, final, fewest))
        tied = rare & parts_of(term.predictor for term in final.terms)
    return Released(
        fewest=fewest,
        rows=None if final is None else final.rows.n,
        digest=None if final is None else final.rows.digest,
        every_row=final is not None and final.rows.n == complete,
        after=_after_influence(lock),
        rare=rare,
        tied=tied,
    )


def parts_of(predictors: Iterable[str | None]) -> frozenset[str]:
    """Predictors by name, with the parts of products."""
    names = {name for name in predictors if name is not None}
    return frozenset(names | {part for name in names for part in name.split(" × ")})


def _after_influence(lock: Lock) -> frozenset[str]:
    """Steps after the last one in which a row can leave."""
    steps = lock.plan.written.get("steps")
    named = [str(step) for step in steps] if isinstance(steps, list | tuple) else []
    if "influence" not in named:
        return frozenset(named)
    return frozenset(named[named.index("influence") + 1 :])


def _rare(lock: Lock, final: FitRecord, fewest: int) -> Iterator[str]:
    """Predictors in which a few rows stand alone, or may do so after rows left."""
    outcome = final.outcome.column
    for column in lock.checks.descriptives:
        if column.column == outcome:
            continue
        least = _least_in_use(lock, column, final)
        if least is None:
            least = _least_as_read(column)
            if least is not None:
                # The rows that left may all have been of one kind.
                least -= max(0, column.n + column.missing - final.rows.n)
        few = least is not None and least < fewest
        if few or _stands_apart(column, fewest):
            yield column.column
    # How many rows have two given levels at once is not recorded.
    for fit in lock.fits:
        yield from (t.predictor for t in fit.terms if t.predictor and t.level and " × " in t.level)


def _stands_apart(column: Descriptive, fewest: int) -> bool:
    """Whether a few rows hold nearly all of a column's spread: of n rows, k such give a kurtosis of n/k."""
    return column.kurtosis is not None and column.kurtosis > max(column.n / fewest, _APART)


def too_few(lock: Lock, fewest: int) -> str | None:
    """Why no number of a lock's answer may stand; None where they may."""
    answer = lock.answer
    if answer is None:
        return None
    if answer.rows < fewest:
        return f"the answer rests on fewer than {fewest} rows"
    for column in lock.checks.descriptives:
        least = _least_as_read(column) if column.column == answer.outcome.column else None
        if least is not None and least - max(0, column.n - answer.rows) < fewest:
            return f"fewer than {fewest} rows may differ from all others in the outcome"
    return None


def _least_as_read(column: Descriptive) -> int | None:
    """Rows of the rarest of a few values, among the eligible rows; None for a number of many values."""
    if column.levels:
        return min((count for count in column.levels.values() if count), default=0)
    low, high, mean, sd = column.minimum, column.maximum, column.mean, column.sd
    if low is None or high is None or mean is None or sd is None or column.n < 2 or high <= low:
        return None
    # The spread of n values between two bounds is largest, and is this, where each is on a bound.
    largest = (high - mean) * (mean - low) * column.n / (column.n - 1)
    if not math.isclose(sd * sd, largest, rel_tol=_SAME):
        return None
    upper = round(column.n * (mean - low) / (high - low))
    return min(upper, column.n - upper)


def _least_in_use(lock: Lock, column: Descriptive, final: FitRecord) -> int | None:
    """The same among the answer's rows, from the predictor's fit by itself; None where that cannot tell.

    In a fit of levels alone a level's standard error is s √(1/rows + 1/rows of the baseline), and the
    intercept's is s √(1/rows of the baseline).
    """
    for fit in lock.fits:
        if fit.rows.digest != final.rows.digest or fit.errors != "classical" or not fit.residual_sd:
            continue
        terms = [term for term in fit.terms if term.predictor is not None]
        if {term.predictor for term in terms} != {column.column} or len(terms) == len(fit.terms):
            continue
        shares = [
            (term.standard_error / fit.residual_sd) ** 2 if term.standard_error else 0.0 for term in fit.terms
        ]
        if column.levels and all(term.level for term in terms):
            base = shares[0]
            if base <= 0 or any(share <= base for share in shares[1:]):
                return 0
            return min(round(1 / base), *(round(1 / (share - base)) for share in shares[1:]))
    return None
