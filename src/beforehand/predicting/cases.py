"""New cases as the equation sees them: columns computed, missing cells filled, and what is out of reach."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from beforehand.faults import did_you_mean
from beforehand.fit.columns import FloatArray
from beforehand.fit.ladder import RUNGS, apply
from beforehand.lock import Lock
from beforehand.lock.numbers import as_recorded
from beforehand.lock.prediction import Prediction, PredictionColumn, PredictionFactor, Seen
from beforehand.plan import FillValue, Plan, evaluate, names_in, parse_formula
from beforehand.table.preparing import AsRead, meets

_RUNG_WORDS = {
    "square_root": "square root",
    "log": "logarithm",
    "reciprocal": "reciprocal",
    "box_cox": "Box-Cox power",
}


@dataclass(slots=True)
class Reasons:
    """Why cases are outside, by row; in the order in which they were found."""

    rows: dict[int, list[str]] = field(default_factory=dict)

    def add(self, row: int, why: str) -> None:
        """Note a reason, once."""
        said = self.rows.setdefault(row, [])
        if why not in said:
            said.append(why)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Prepared:
    """Cases ready for the equation.

    Attributes
    ----------
    design : FloatArray, shape (n, k)
        Columns of the model; NaN throughout a row that cannot be predicted.
    reasons : Reasons
    filled : mapping of row to names of the predictors that were filled
    """

    design: FloatArray
    reasons: Reasons
    filled: Mapping[int, list[str]]


def prepared_cases(lock: Lock, plan: Plan, prediction: Prediction, read: AsRead) -> Prepared:
    """Cases under the plan's contract; nothing about a single case is an error.

    Parameters
    ----------
    lock : Lock
        Whose fills are used again.
    plan : Plan
        The lock's.
    prediction : Prediction
    read : AsRead
        The columns of `needs.wanted_by`.
    """
    work = _Work(lock, plan, read)
    work.population()
    values = {name: work.predictor(name, seen) for name, seen in prediction.seen.items()}
    for pair in prediction.together or ():
        known = frozenset(pair.pairs)
        both = zip(values[pair.first].tolist(), values[pair.second].tolist(), strict=True)
        for row, (one, other) in enumerate(both):
            if one is not None and other is not None and (one, other) not in known:
                what = f"{pair.first} {one!r} with {pair.second} {other!r} was not seen in the fit"
                work.unusable(row, what)
    design = np.empty((read.n_rows, len(prediction.columns)))
    for place, column in enumerate(prediction.columns):
        design[:, place] = work.column(column, values)
    design[work.lost] = np.nan
    return Prepared(design=design, reasons=work.reasons, filled=work.filled)


class _Work:
    """Goes through the columns of one table of new cases."""

    def __init__(self, lock: Lock, plan: Plan, read: AsRead) -> None:
        self.reasons = Reasons()
        self.filled: dict[int, list[str]] = {}
        self.lost = np.zeros(read.n_rows, dtype=bool)
        self._plan, self._read = plan, read
        self._predictors = {p.column: p for p in plan.predictors}
        self._fills = _fills(lock, plan)
        self._derived = {line.column: parse_formula(line.from_) for line in plan.derive}
        self._columns: dict[str, NDArray[Any]] = dict(read.columns)

    def unusable(self, row: int, why: str) -> None:
        """Note that a case cannot be predicted."""
        self.lost[row] = True
        self.reasons.add(row, why)

    def population(self) -> None:
        """Lines of eligibility that a case does not meet; those about the outcome are not looked at."""
        for line in self._plan.eligibility:
            if line.column not in self._read.columns:
                continue
            name, value = line.condition
            shown = ", ".join(map(_shown, value)) if isinstance(value, tuple) else _shown(value)
            asks = f"{line.column} {name.replace('_', ' ')} {shown}"
            says = f"not in the population: it does not meet {asks!r}"
            for row in np.flatnonzero(~meets(line, self._read.columns[line.column])).tolist():
                self.reasons.add(row, says)

    def values(self, name: str) -> NDArray[Any]:
        """A column as read, or computed from others."""
        known = self._columns.get(name)
        if known is None:
            formula = self._derived[name]
            made = evaluate(formula, {part: self.values(part) for part in names_in(formula)})
            known = self._columns[name] = np.broadcast_to(made, self._read.n_rows) + 0.0
        return known

    def predictor(self, name: str, seen: Seen) -> NDArray[Any]:
        """A predictor's values in every case, with what is wrong with them noted."""
        if seen.levels is not None:
            return self._category(name, seen.levels)
        return self._number(name, seen)

    def _category(self, name: str, levels: tuple[str, ...]) -> NDArray[Any]:
        """Levels of a category; None where a case has none that was seen."""
        values = self.values(name).copy()
        fill = self._fills.get(name)
        hints: dict[str, str] = {}
        for row, level in enumerate(values.tolist()):
            if level is None and fill is not None:
                values[row] = level = str(fill)
                self.filled.setdefault(row, []).append(name)
            if level is None:
                self.unusable(row, f"{name} is missing")
            elif level not in levels:
                if level not in hints:
                    hints[level] = did_you_mean(level, levels)
                self.unusable(row, f"{name} {level!r} was not seen in the fit{hints[level]}")
                values[row] = None
        return values

    def _number(self, name: str, seen: Seen) -> FloatArray:
        """A number; NaN where a case has none."""
        values = np.array(self.values(name), dtype=np.float64)
        impossible = self._out_of_range(name, values)
        fill = self._fills.get(name)
        for row in np.flatnonzero(np.isnan(values)).tolist():
            why = impossible.get(row)
            if fill is not None and (why is None or self._plan.missing_data.out_of_range == "missing"):
                values[row] = float(fill)
                self.filled.setdefault(row, []).append(name)
                if why is not None:
                    self.reasons.add(row, f"{why} and was filled with {_shown(float(fill))}")
            elif why is not None:
                self.unusable(row, why)
            else:
                computed = " or cannot be computed" if name in self._derived else ""
                self.unusable(row, f"{name} is missing{computed}")
        self._beyond(name, values, seen)
        return values

    def _out_of_range(self, name: str, values: FloatArray) -> dict[int, str]:
        """Values outside the declared range, which no case can have; they are taken out of ``values``."""
        limits = self._predictors[name].range
        if limits is None:
            return {}
        low = -np.inf if limits[0] is None else limits[0]
        high = np.inf if limits[1] is None else limits[1]
        ends = ", ".join("" if end is None else _shown(end) for end in limits)
        with np.errstate(invalid="ignore"):
            rows = np.flatnonzero((values < low) | (values > high)).tolist()
        found = {
            row: f"{name} {_shown(float(values[row]))} is outside its declared range [{ends}]" for row in rows
        }
        values[rows] = np.nan
        return found

    def _beyond(self, name: str, values: FloatArray, seen: Seen) -> None:
        """Values beyond what the fit has seen; the lock knows its ends to ten digits."""
        assert seen.low is not None
        assert seen.high is not None
        with np.errstate(invalid="ignore"):
            rows = np.flatnonzero((values < seen.low) | (values > seen.high)).tolist()
        for row in rows:
            value = float(values[row])
            if as_recorded(value) > seen.high:
                said, end = told_apart(value, seen.high)
                self.reasons.add(row, f"{name} {said} is above the largest seen, {end}")
            elif as_recorded(value) < seen.low:
                said, end = told_apart(value, seen.low)
                self.reasons.add(row, f"{name} {said} is below the smallest seen, {end}")

    def column(self, column: PredictionColumn, values: Mapping[str, NDArray[Any]]) -> FloatArray:
        """A column of the design."""
        product: FloatArray | None = None
        with np.errstate(over="ignore", invalid="ignore"):
            for factor in column.factors:
                one = self._factor(factor, values[factor.column])
                product = one if product is None else product * one
        assert product is not None
        for row in np.flatnonzero(~np.isfinite(product) & ~self.lost).tolist():
            self.unusable(row, f"{column.term} is too large to compute")
        return product

    def _factor(self, factor: PredictionFactor, values: NDArray[Any]) -> FloatArray:
        """The indicator of a level, or a number under its rung."""
        if factor.level is not None:
            return np.asarray(values == factor.level, dtype=np.float64)
        if factor.rung is None:
            return values
        outside = RUNGS[factor.rung].outside
        if outside is not None:
            with np.errstate(invalid="ignore"):
                rows = np.flatnonzero(outside(values)).tolist()
            for row in rows:
                what = _RUNG_WORDS[factor.rung]
                self.unusable(row, f"{factor.column} {_shown(float(values[row]))} has no {what}")
        return apply(factor.rung, values, 1.0 if factor.exponent is None else factor.exponent)


def _fills(lock: Lock, plan: Plan) -> Mapping[str, float | str]:
    """Values for missing cells: those that the run learned, and those that the plan declares.

    A fill by regression has no one value, and its coefficients are not in the record.
    """
    if "missing_data" not in plan.steps:
        return {}
    declared = {name: how.value for name, how in plan.missing_data.fill.items() if isinstance(how, FillValue)}
    learned = {
        fill.predictor: fill.value
        for fill in lock.checks.fills
        if fill.method != "regression" and fill.value is not None
    }
    return {**declared, **learned}


def _shown(value: float | str) -> str:
    """A value as a person would write it."""
    return value if isinstance(value, str) else f"{value:.10g}"


def told_apart(value: float, end: float, *, digits: int = 4) -> tuple[str, str]:
    """Two numbers to as few digits as tell them apart, at least ``digits``."""
    for count in range(digits, 10):
        one, other = f"{value:.{count}g}", f"{end:.{count}g}"
        if one != other:
            return one, other
    return f"{value:.10g}", f"{end:.10g}"
