"""The old model on old and new rows: what moved its coefficients, and whether it is still the same line."""

from __future__ import annotations

import itertools
import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from scipy.special import fdtrc

from beforehand.fit.columns import FloatArray, Key
from beforehand.fit.moments import ArraySource, moments_of
from beforehand.fit.sweeping import RankDeficient
from beforehand.fit.tableau import Tableau, tableau_of
from beforehand.refreshing.rows import identities
from beforehand.running import Trail
from beforehand.steps.state import Model, column_name

SOURCES = ("new_rows", "gone_rows", "revised_rows")


@dataclass(frozen=True, slots=True, kw_only=True)
class Chow:
    """Chow's (1960) test that one line holds for old and new rows.

    Attributes
    ----------
    form : str
        ``two_lines`` where the new rows determine a line of their own, else ``prediction``.
    f : float
    df : tuple of int
    p : float
    """

    form: str
    f: float
    df: tuple[int, int]
    p: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Prediction:
    """The old equation on rows that it has not seen, on the scale on which it was fitted.

    Attributes
    ----------
    rows : int
    mean_error : float
        Observed less predicted.
    typical_error : float
        Root of the mean squared error.
    old_residual_sd : float
    ratio : float
        Typical error over the old residual standard deviation.
    """

    rows: int
    mean_error: float
    typical_error: float
    old_residual_sd: float
    ratio: float


@dataclass(frozen=True, slots=True, kw_only=True)
class OldForm:
    """The old model, looked at with the rows of both tables.

    Attributes
    ----------
    shares : mapping of term to mapping of source to float
        How much of a coefficient's shift new, gone and revised rows make: the mean over the orders in
        which they can be taken (Shapley 1953). Empty where the model can be fitted along none.
    chow : Chow or None
    prediction : Prediction or None
        Both None where the new table has no row that the old fit did not use.
    """

    shares: Mapping[str, Mapping[str, float]]
    chow: Chow | None
    prediction: Prediction | None


@dataclass(frozen=True, slots=True)
class _Rows:
    """Design and outcome of the rows that one run has in use, by what a row is known by."""

    places: Mapping[str, int]
    columns: Mapping[Key, FloatArray]

    def taken(self, names: Sequence[str]) -> dict[Key, FloatArray]:
        """Columns of some rows."""
        at = np.array([self.places[name] for name in names], dtype=np.int64)
        return {key: values[at] for key, values in self.columns.items()}


def old_form(old: Trail, new: Trail) -> OldForm | None:
    """The old model on the rows of both runs.

    Parameters
    ----------
    old, new : Trail
        Runs of one plan on the old and on the refreshed table.

    Returns
    -------
    OldForm or None
        None where the old run has no model with a predictor.
    """
    if old.final is None or not old.final.model.terms:
        return None
    model = old.final.model
    before, after = _rows(old, model), _rows(new, model)
    revised = tuple(
        name for name in before.places if name in after.places and not _equal(before, after, name)
    )
    come = tuple(name for name in after.places if name not in before.places)
    return OldForm(
        shares=_shares(model, before, after, come, revised),
        chow=_chow(model, before, after, come),
        prediction=_prediction(model, before, after, come),
    )


def _rows(trail: Trail, model: Model) -> _Rows:
    """The rows that a run has in use, as the model sees them; a row with a gap in them is left out."""
    known = list(identities(trail.table))
    kept = trail.base.kept
    positions = np.delete(np.arange(len(kept), dtype=np.int64), trail.state.rows.gone)
    columns = {key: trail.source.rows(key, positions) for key in (*model.keys, model.outcome)}
    whole = np.ones(len(positions), dtype=bool)
    for values in columns.values():
        whole &= np.isfinite(values)
    names = [known[int(kept[position])] for position in positions[whole]]
    return _Rows(
        {name: place for place, name in enumerate(names)},
        {key: values[whole] for key, values in columns.items()},
    )


def _equal(before: _Rows, after: _Rows, name: str) -> bool:
    """Whether a row says the same to the model in both tables."""
    first, second = before.places[name], after.places[name]
    return all(before.columns[key][first] == after.columns[key][second] for key in before.columns)


def _fitted(model: Model, parts: Sequence[Mapping[Key, FloatArray]]) -> Tableau | None:
    """The model on some rows; None where they do not determine it."""
    columns = {key: np.concatenate([part[key] for part in parts]) for key in parts[0]}
    rows = len(next(iter(columns.values())))
    if rows < model.p:
        return None
    moments = moments_of(ArraySource(columns), (*model.keys, model.outcome))
    try:
        return tableau_of(moments, model.outcome, model.keys, intercept=model.intercept)
    except RankDeficient:
        return None


def _estimates(model: Model, tableau: Tableau) -> dict[str, float]:
    """Coefficients by their names in the record."""
    found = {"intercept": float(tableau.constant)} if model.intercept else {}
    return found | dict(zip(map(column_name, model.keys), tableau.estimates, strict=True))


def _shares(
    model: Model, before: _Rows, after: _Rows, come: Sequence[str], revised: Sequence[str]
) -> dict[str, dict[str, float]]:
    """Shapley's division of each shift among new, gone and revised rows."""
    gone = [name for name in before.places if name not in after.places]
    changed = set(revised)
    steady = [name for name in before.places if name in after.places and name not in changed]
    value: dict[frozenset[str], dict[str, float]] = {}
    for size in range(len(SOURCES) + 1):
        for taken in map(frozenset, itertools.combinations(SOURCES, size)):
            parts = [before.taken(steady)]
            parts.append((after if "revised_rows" in taken else before).taken(revised))
            if "gone_rows" not in taken:
                parts.append(before.taken(gone))
            if "new_rows" in taken:
                parts.append(after.taken(come))
            tableau = _fitted(model, parts)
            if tableau is not None:
                value[taken] = _estimates(model, tableau)
    # Where all rows are replaced they cannot be gone before the new ones are there: such an order is none.
    orders = [order for order in itertools.permutations(SOURCES) if all(_before(order, value))]
    if not orders:
        return {}
    found: dict[str, dict[str, float]] = {}
    for term in value[frozenset()]:
        found[term] = {
            source: math.fsum(
                value[frozenset(order[: order.index(source) + 1])][term]
                - value[frozenset(order[: order.index(source)])][term]
                for order in orders
            )
            / len(orders)
            for source in SOURCES
        }
    return found


def _before(order: Sequence[str], value: Mapping[frozenset[str], object]) -> list[bool]:
    """Whether the model could be fitted at each place of an order."""
    return [frozenset(order[:size]) in value for size in range(len(order) + 1)]


def _chow(model: Model, before: _Rows, after: _Rows, come: Sequence[str]) -> Chow | None:
    """One line for both, against a line for each; with few new rows, against the old line alone."""
    if not come:
        return None
    first, second = before.taken(list(before.places)), after.taken(come)
    old, both = _fitted(model, [first]), _fitted(model, [first, second])
    if old is None or both is None or old.exact:
        return None
    n, m, p = len(before.places), len(come), model.p
    own = _fitted(model, [second]) if m > p else None
    rss_old, rss_both = float(old.rss), float(both.rss)
    if own is not None:
        apart = rss_old + float(own.rss)
        df = (p, n + m - 2 * p)
        form = "two_lines"
    else:
        apart, df, form = rss_old, (m, n - p), "prediction"
    if df[1] < 1 or apart <= 0:
        return None
    f = max(0.0, (rss_both - apart) / df[0]) / (apart / df[1])
    return Chow(form=form, f=f, df=df, p=float(fdtrc(*df, f)))


def _prediction(model: Model, before: _Rows, after: _Rows, come: Sequence[str]) -> Prediction | None:
    """The old equation on the new rows."""
    old = _fitted(model, [before.taken(list(before.places))]) if come else None
    if old is None or old.df < 1 or old.exact:
        return None
    rows = after.taken(come)
    error = rows[model.outcome] - float(old.constant)
    for key, slope in zip(model.keys, old.estimates, strict=True):
        error = error - slope * rows[key]
    sd = math.sqrt(float(old.rss) / old.df)
    typical = math.sqrt(math.fsum((error * error).tolist()) / len(error))
    return Prediction(
        rows=len(error), mean_error=math.fsum(error.tolist()) / len(error), typical_error=typical,
        old_residual_sd=sd, ratio=typical / sd,
    )  # fmt: skip
