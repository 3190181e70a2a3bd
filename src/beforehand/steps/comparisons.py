"""What each row changes when it is left out: R², the coefficient that moves most, significance, signs."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from beforehand.fit.influence import Influence, WithoutEach
from beforehand.steps.bench import Comparison, Fitted, Measures, Positions
from beforehand.steps.state import column_name


def measured(found: Influence, positions: Positions) -> Measures:
    """Influence measures as a step reads them, with the rows' positions in the base."""
    return Measures(
        positions=positions,
        leverage=found.leverage,
        studentized=found.external,
        cooks_distance=found.cooks_distance,
        dffits=found.dffits,
        largest_dfbetas=found.largest_dfbetas,
        covariance_ratio=found.covariance_ratio,
        sole=found.sole,
    )


def compared(
    fitted: Fitted, found: WithoutEach, positions: Positions, alpha: float
) -> tuple[Comparison, ...]:
    """One comparison for each row that was left out alone.

    Parameters
    ----------
    fitted : Fitted
        The fit with all its rows.
    found : WithoutEach
        m rows, each left out alone.
    positions : array of int, shape (m,)
        Their positions in the base.
    alpha : float
        Level at which significance is judged.
    """
    model = fitted.model
    owner = [term.name for term in model.terms for _ in term.keys]
    significance = _by_row(_significance_changes(fitted, found, alpha), len(positions))
    signs = _by_row(_sign_changes(fitted, found, owner, alpha), len(positions))
    columns = [column_name(key) for key in model.keys]
    rows = zip(
        positions.tolist(),
        found.change_r_squared.tolist(),
        found.change_coefficient.tolist(),
        found.column.tolist(),
        significance,
        signs,
        strict=True,
    )
    return tuple(
        Comparison(
            position=position,
            change_r_squared=change_r_squared,
            change_coefficient=change_coefficient,
            of=columns[column],
            significance_changes=significant,
            sign_changes=turned,
        )
        for position, change_r_squared, change_coefficient, column, significant, turned in rows
    )


def _by_row(changes: Mapping[str, NDArray[np.bool_]], rows: int) -> list[tuple[str, ...]]:
    """For each row, the predictors in which leaving it out changes something."""
    found: list[tuple[str, ...]] = [()] * rows
    for name, changed in changes.items():
        for row in np.flatnonzero(changed).tolist():
            found[row] = (*found[row], name)
    return found


def _significance_changes(
    fitted: Fitted, found: WithoutEach, alpha: float
) -> Mapping[str, NDArray[np.bool_]]:
    """For each predictor, without which rows its significance is another."""
    return {name: (p <= alpha) != fitted.significant(name, alpha) for name, p in found.p.items()}


def _sign_changes(
    fitted: Fitted, found: WithoutEach, owner: Sequence[str], alpha: float
) -> Mapping[str, NDArray[np.bool_]]:
    """For each predictor, without which rows a sign differs, where it is significant in either fit."""
    changes: dict[str, NDArray[np.bool_]] = {}
    slopes = [c.estimate for c in fitted.fit.coefficients if c.key is not None]
    for place, name in enumerate(owner):
        turned = (found.estimates[:, place] * slopes[place]) < 0.0
        matters = (found.p[name] <= alpha) | fitted.significant(name, alpha)
        changes[name] = changes.get(name, np.zeros(len(turned), dtype=bool)) | (turned & matters)
    return changes
