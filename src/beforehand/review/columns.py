"""What is peculiar in the predictors by themselves: constants, rare levels, copies, overlap."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from beforehand.fit.columns import FloatArray, Key
from beforehand.fit.dependence import dependence
from beforehand.fit.moments import Moments
from beforehand.plan import Plan
from beforehand.review.findings import Finding, caution, figure, listed, note, percent
from beforehand.steps.keeping import Keeping
from beforehand.steps.source import TableSource
from beforehand.steps.state import Model, column_name

# A predictor with one value in so large a share of the rows rests on the few others.
NEARLY_CONSTANT = 0.95

# A level with fewer rows has a coefficient that single rows decide.
SPARSE = 5

# Correlations this near to 1 are looked at for an exact copy; farther ones cannot be.
_NEARLY_ONE = 1.0 - 1e-9


@dataclass(frozen=True, slots=True, kw_only=True)
class Commonest:
    """A predictor that hardly varies: its commonest value and the share of rows that have it."""

    predictor: str
    value: float | str
    share: float


@dataclass(frozen=True, slots=True, kw_only=True)
class LevelCount:
    """A level of a category with few rows, or none."""

    predictor: str
    level: str
    rows: int
    baseline: bool


@dataclass(frozen=True, slots=True, kw_only=True)
class Related:
    """Two predictors of one column each and their correlation."""

    first: str
    second: str
    r: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Determined:
    """A predictor that others determine exactly, with the equation."""

    predictor: str
    equation: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Columns:
    """What is peculiar in the predictors of the complete rows, in plan order.

    Attributes
    ----------
    constant : predictors with one value
    nearly_constant : those with one value in ``NEARLY_CONSTANT`` of the rows or more
    two_valued : numeric predictors with two values
    sparse_levels : levels with fewer than ``SPARSE`` rows
    duplicates : pairs with a correlation of exactly 1 or −1
    determined : predictors that are an exact combination of ones before them
    related : pairs at or over the plan's limit of correlation, the largest first
    """

    constant: tuple[str, ...]
    nearly_constant: tuple[Commonest, ...]
    two_valued: tuple[str, ...]
    sparse_levels: tuple[LevelCount, ...]
    duplicates: tuple[Related, ...]
    determined: tuple[Determined, ...]
    related: tuple[Related, ...]


NO_COLUMNS = Columns(
    constant=(),
    nearly_constant=(),
    two_valued=(),
    sparse_levels=(),
    duplicates=(),
    determined=(),
    related=(),
)


def columns_of(plan: Plan, source: TableSource, model: Model, moments: Moments) -> tuple[Columns, Model]:
    """Look at the predictors of the complete rows; also the model less what others determine.

    Parameters
    ----------
    model : Model
        The full model, of at least one row and one predictor.
    moments : Moments
        Of the model's columns; they need not hold the outcome.
    """
    constant: list[str] = []
    nearly: list[Commonest] = []
    two_valued: list[str] = []
    sparse: list[LevelCount] = []
    for predictor in plan.predictors:
        name = predictor.column
        if name not in model.names:
            continue
        values = source.raw(name)
        if predictor.kind == "number":
            low, high = float(values.min()), float(values.max())
            common = _median_element(values)
            share = float(np.mean(values == common))
            shown: float | str = common
            if low < high and bool(np.all((values == low) | (values == high))):
                two_valued.append(name)
        else:
            levels = source.levels(name)
            counts = np.bincount(values.astype(np.int64), minlength=len(levels))
            baseline = predictor.baseline or levels[0]
            sparse += [
                LevelCount(predictor=name, level=level, rows=int(rows), baseline=level == baseline)
                for level, rows in zip(levels, counts.tolist(), strict=True)
                if rows < SPARSE
            ]
            share = float(counts.max()) / len(values)
            shown = levels[int(np.argmax(counts))]
        if share == 1.0:
            constant.append(name)
        elif share >= NEARLY_CONSTANT:
            nearly.append(Commonest(predictor=name, value=shown, share=share))
    duplicates, related = _pairs(plan, model, moments, constant)
    determined, independent = _determined(model, moments)
    found = Columns(
        constant=tuple(constant),
        nearly_constant=tuple(nearly),
        two_valued=tuple(two_valued),
        sparse_levels=tuple(sparse),
        duplicates=duplicates,
        determined=determined,
        related=related,
    )
    return found, independent


def _median_element(values: FloatArray) -> float:
    """A middle value, which is the commonest one wherever one has more than half of the rows."""
    middle = len(values) // 2
    return float(np.partition(values, middle)[middle])


def _pairs(
    plan: Plan, model: Model, moments: Moments, constant: list[str]
) -> tuple[tuple[Related, ...], tuple[Related, ...]]:
    """Copies, and pairs at or over the plan's limit; a product beside its own part is no pair."""
    keeping = Keeping(plan)
    limit = plan.collinearity.examine_when.correlation_above
    single = [term for term in model.terms if term.single and term.name not in constant]
    duplicates: list[Related] = []
    related: list[Related] = []
    for place, one in enumerate(single):
        for other in single[place + 1 :]:
            if one.name in keeping.parts(other.name) or other.name in keeping.parts(one.name):
                continue
            keys = (one.keys[0], other.keys[0])
            pair = Related(first=one.name, second=other.name, r=moments.correlation(*keys))
            if abs(pair.r) >= _NEARLY_ONE and dependence(moments, keys, intercept=True) is not None:
                duplicates.append(pair)
            elif limit is not None and abs(pair.r) >= limit:
                related.append(pair)
    # A stable sort: pairs of equal size stay in plan order.
    related.sort(key=lambda pair: -abs(pair.r))
    return tuple(duplicates), tuple(related)


def _determined(model: Model, moments: Moments) -> tuple[tuple[Determined, ...], Model]:
    """Predictors that ones before them determine, and the model without them."""
    found: list[Determined] = []
    while model.terms:
        linked = dependence(moments, model.keys, intercept=model.intercept)
        if linked is None:
            break
        owner = next(term.name for term in model.terms if linked.key in term.keys)
        hanging = [term.name for term in model.terms if owner in term.parts]
        found.append(Determined(predictor=owner, equation=_equation(linked.key, linked.weights)))
        model = model.without(owner, *hanging)
    return tuple(found), model


def _equation(key: Key, weights: tuple[tuple[Key | None, float], ...]) -> str:
    """A dependence as a sum."""
    parts = [
        figure(weight) if column is None else f"{figure(weight)} × {column_name(column)}"
        for column, weight in weights
        if weight
    ]
    return f"{column_name(key)} = {' + '.join(parts) or '0'}"


def column_findings(plan: Plan, columns: Columns) -> Iterator[Finding]:
    """What a reviewer should know of the predictors."""
    place_of = {p.column: f"predictors[{place}]" for place, p in enumerate(plan.predictors)}
    for name in columns.constant:
        yield caution(
            "constant-predictor", place_of[name],
            f"{name} has one value in all complete rows and will leave.",
        )  # fmt: skip
    for common in columns.nearly_constant:
        value = common.value if isinstance(common.value, str) else f"{common.value:.10g}"
        yield note(
            "nearly-constant-predictor", place_of[common.predictor],
            f"{common.predictor} is {value} in {percent(common.share)} of the complete rows, so the "
            "others alone carry its coefficient.",
        )  # fmt: skip
    checks_curvature = "curvature" in plan.transforms.when and "transforms" in plan.steps
    if columns.two_valued and checks_curvature:
        verb = "has" if len(columns.two_valued) == 1 else "have"
        yield note(
            "two-valued-predictor", "transforms.when",
            f"{listed(columns.two_valued)} {verb} two values only: a curve has no meaning there and is not "
            "looked for.",
        )  # fmt: skip
    yield from _level_findings(columns, place_of)
    for pair in columns.duplicates:
        yield caution(
            "duplicate-predictors", place_of.get(pair.second, "products"),
            f"{pair.first} and {pair.second} have a correlation of exactly {pair.r:+.0f}: one is a copy of "
            "the other in another unit, and the later one leaves unless a rule keeps it.",
        )  # fmt: skip
    copies = {(pair.first, pair.second) for pair in columns.duplicates}
    for linked in columns.determined:
        if linked.predictor in columns.constant or any(second == linked.predictor for _, second in copies):
            continue
        yield caution(
            "dependent-predictor", place_of.get(linked.predictor, "products"),
            f"{linked.equation} holds in every complete row, so one of these leaves: the latest that no rule "
            "keeps.",
        )  # fmt: skip
    limit = plan.collinearity.examine_when.correlation_above
    follow = "the pair will be examined" if "collinearity" in plan.steps else "collinearity does not run"
    for pair in columns.related:
        yield note(
            "related-predictors", "collinearity.examine_when.correlation_above",
            f"{pair.first} and {pair.second} have a correlation of {pair.r:.3f}, limit {limit:g}: {follow}.",
        )  # fmt: skip


def _level_findings(columns: Columns, place_of: dict[str, str]) -> Iterator[Finding]:
    """Levels with few rows, or none."""
    for level in columns.sparse_levels:
        place = f"{place_of[level.predictor]}.{'baseline' if level.baseline else 'levels'}"
        what = f"level {level.level} of {level.predictor}"
        if level.baseline:
            says = (
                f"The baseline, {what}, has no complete row, so another level takes its place."
                if not level.rows
                else f"The baseline, {what}, has {_rows(level.rows)}: every comparison with it is uncertain."
            )
            yield caution("sparse-baseline", place, says)
        elif not level.rows:
            yield note("empty-level", place, f"The {what} has no complete row and no coefficient.")
        else:
            yield caution(
                "sparse-level", place,
                f"The {what} has {_rows(level.rows)}, so single rows decide its coefficient.",
            )  # fmt: skip


def _rows(count: int) -> str:
    """A counted noun."""
    return f"{count} complete row{'' if count == 1 else 's'}"
