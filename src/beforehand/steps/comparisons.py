"""What each row changes when it is left out: R², the coefficient that moves most, significance, signs."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from beforehand.fit.influence import WithoutEach
from beforehand.steps.bench import Comparison, Fitted, Positions
from beforehand.steps.state import column_name


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
    significance = _significance_changes(fitted, found, alpha)
    signs = _sign_changes(fitted, found, owner, alpha)
    return tuple(
        Comparison(
            position=position,
            change_r_squared=float(found.change_r_squared[at]),
            change_coefficient=float(found.change_coefficient[at]),
            of=column_name(model.keys[int(found.column[at])]),
            significance_changes=tuple(name for name, changes in significance.items() if changes[at]),
            sign_changes=tuple(name for name, changes in signs.items() if changes[at]),
        )
        for at, position in enumerate(positions.tolist())
    )


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
