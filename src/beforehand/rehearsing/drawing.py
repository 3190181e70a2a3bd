"""Predictors drawn from what a plan declares of them, where no table is at hand.

Numbers are normal with the declared means, standard deviations and correlations. One with a declared
range is that normal cut off at the ends of the range, so that no value outside it is ever drawn; its
own mean and standard deviation are then those of the whole bell, and its correlations are those of the
bells. Categories are drawn by their shares, each for itself. No cell is missing.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping
from dataclasses import dataclass

import numpy as np

from beforehand.faults import Fault, PlanError
from beforehand.plan import ExpectedPredictor, Plan, Predictor
from beforehand.plan.places import keyed, line_of
from beforehand.rehearsing.trials import FloatArray
from beforehand.table import Column

# A range that holds less of the bell is a slip of the pen, and what lies in it would be drawn badly.
SMALLEST_SHARE_IN_RANGE = 1e-3

# As where the plan is checked.
SMALLEST_EIGENVALUE = 1e-10


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class DrawnNumbers:
    """Numbers that are drawn together; k of them.

    Attributes
    ----------
    names : tuple of str, length k
    means, sds : FloatArray, shape (k,)
    root : FloatArray, shape (k, k)
        Lower triangular; times its transpose it is the correlation matrix.
    below, inside : FloatArray, shape (k,)
        Share of each bell that lies below the declared range, and in it; 0 and 1 without one.
    """

    names: tuple[str, ...]
    means: FloatArray
    sds: FloatArray
    root: FloatArray
    below: FloatArray
    inside: FloatArray


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class DrawnCategory:
    """A category and the shares of its levels, adding up to 1, in the order of its levels."""

    name: str
    levels: tuple[str, ...]
    shares: FloatArray


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Declared:
    """Everything that the rows of a table are drawn from."""

    numbers: DrawnNumbers
    categories: tuple[DrawnCategory, ...]


def declared_predictors(plan: Plan) -> Declared:
    """What a plan declares of its predictors, all that is needed to draw them.

    Raises
    ------
    PlanError
        With every predictor that lacks a mean and sd, or shares; every range that hardly a value of the
        declared bell lies in; correlations that cannot hold together; clusters, which cannot be drawn.
    """
    faults = list(_faults(plan))
    if faults:
        raise PlanError(faults)
    about = _expected(plan)
    numbers = [(p, about[p.column]) for p in plan.predictors if p.kind == "number"]
    inside = [_inside(predictor, given) for predictor, given in numbers]
    categories = []
    for predictor in plan.predictors:
        if predictor.kind == "category":
            shares = np.array([about[predictor.column].shares.get(level, 0.0) for level in predictor.levels])
            shares = shares / math.fsum(shares)
            categories.append(DrawnCategory(name=predictor.column, levels=predictor.levels, shares=shares))
    names = tuple(predictor.column for predictor, _ in numbers)
    drawn = DrawnNumbers(
        names=names,
        means=np.array([given.mean for _, given in numbers], dtype=np.float64),
        sds=np.array([given.sd for _, given in numbers], dtype=np.float64),
        root=np.asarray(np.linalg.cholesky(correlation_matrix(plan, names)), dtype=np.float64),
        below=np.array([below for below, _ in inside], dtype=np.float64),
        inside=np.array([share for _, share in inside], dtype=np.float64),
    )
    return Declared(numbers=drawn, categories=tuple(categories))


def correlation_matrix(plan: Plan, names: tuple[str, ...]) -> FloatArray:
    """Expected correlations of some numbers, 0 where the plan names none, shape (k, k)."""
    place = {name: number for number, name in enumerate(names)}
    matrix = np.eye(len(names))
    for line in plan.expects.correlations if plan.expects is not None else ():
        if line.between[0] in place and line.between[1] in place:
            first, second = (place[name] for name in line.between)
            matrix[first, second] = matrix[second, first] = line.r
    return matrix


def drawn_columns(declared: Declared, rng: np.random.Generator, rows: int) -> dict[str, Column]:
    """One column a predictor, drawn anew.

    Parameters
    ----------
    declared : Declared
    rng : Generator
    rows : int

    Returns
    -------
    dict of name to Column, numbers first
    """
    numbers = declared.numbers
    bells = rng.standard_normal((rows, len(numbers.names))) @ numbers.root.T
    columns: dict[str, Column] = {}
    for place, name in enumerate(numbers.names):
        bell = bells[:, place]
        if numbers.inside[place] < 1.0:
            bell = _cut(bell, float(numbers.below[place]), float(numbers.inside[place]))
        values = numbers.means[place] + numbers.sds[place] * bell
        columns[name] = Column(name=name, kind="number", values=values)
    for category in declared.categories:
        ends = np.cumsum(category.shares)
        codes = np.searchsorted(ends, rng.random(rows), side="right")
        codes = np.minimum(codes, _last(category.shares)).astype(np.int32)
        columns[category.name] = Column(
            name=category.name, kind="category", values=codes, levels=category.levels
        )
    return columns


def _last(shares: FloatArray) -> int:
    """The last level that is drawn at all: where rounding ends the shares a hair below 1."""
    return int(np.flatnonzero(shares)[-1])


def _cut(bell: FloatArray, below: float, inside: float) -> FloatArray:
    """Standard normal values moved, in their order, into the part of the bell that a range leaves."""
    from scipy.special import ndtr, ndtri

    return np.asarray(ndtri(below + inside * ndtr(bell)), dtype=np.float64)


def _inside(predictor: Predictor, given: ExpectedPredictor) -> tuple[float, float]:
    """Share of a predictor's bell that lies below its range, and in it."""
    from scipy.special import ndtr

    if predictor.range is None or given.mean is None or given.sd is None:
        return 0.0, 1.0
    low, high = predictor.range
    below = 0.0 if low is None else float(ndtr((low - given.mean) / given.sd))
    above = 0.0 if high is None else float(ndtr((given.mean - high) / given.sd))
    return below, max(0.0, 1.0 - below - above)


def _expected(plan: Plan) -> Mapping[str, ExpectedPredictor]:
    """What the plan says of its predictors."""
    return (plan.expects.predictors if plan.expects is not None else None) or {}


def _faults(plan: Plan) -> Iterator[Fault]:
    """Everything for which no rows can be drawn."""
    about = _expected(plan)
    for predictor in plan.predictors:
        name = predictor.column
        place = keyed("expects.predictors", name)
        given = about.get(name)
        if predictor.kind == "category":
            if given is None or not given.shares:
                what = f"without a table the shares of the levels of {name!r} must be declared"
                yield plan_fault(plan, place, f"is missing; {what}", "not_declared")
        elif given is None or given.mean is None or given.sd is None:
            lacking = " and ".join(
                key for key in ("mean", "sd") if given is None or getattr(given, key) is None
            )
            what = f"lacks {lacking}; without a table {name!r} is drawn from its declared mean and sd"
            yield plan_fault(plan, place, what, "not_declared")
        elif _inside(predictor, given)[1] < SMALLEST_SHARE_IN_RANGE:
            what = f"has a mean and sd of which hardly a value lies in the declared range of {name!r}"
            yield plan_fault(plan, place, what, "range")
    if plan.expects is not None and plan.expects.correlations:
        names = tuple(p.column for p in plan.predictors if p.kind == "number")
        if np.linalg.eigvalsh(correlation_matrix(plan, names))[0] <= SMALLEST_EIGENVALUE:
            what = "cannot all hold at once: the matrix is not positive definite"
            yield plan_fault(plan, "expects.correlations", what, "correlations")
    clusters = getattr(plan.errors, "cluster_by", None)
    if clusters is not None and clusters not in about:
        what = f"names the clusters by {clusters!r}, which cannot be drawn without a table"
        yield plan_fault(plan, "errors.cluster_by", what, "not_declared")


def plan_fault(plan: Plan, place: str, what: str, code: str) -> Fault:
    """A fault of a plan with its file and line, where it was read from one."""
    origin = plan.origin
    file = origin.name if origin is not None else "plan"
    return Fault(
        file=file, line=line_of(place, origin.lines if origin is not None else {}),
        place=place, what=what, code=code,
    )  # fmt: skip
