"""The decisions of a plan, scripted with statsmodels as one would write it without this program.

`loop` is the plain loop: least squares refitted for each elimination step. `twin` makes every decision
of a plan with default rules (transforms, collinearity, influence, selection, final checks) by the
library's own calls. Neither records anything, searches for exact dependence or goes on in doubt.
"""

from __future__ import annotations

import warnings
from dataclasses import dataclass
from itertools import combinations
from math import ceil
from typing import Any

import numpy as np
import statsmodels.api as sm
from statsmodels.stats.diagnostic import acorr_breusch_godfrey, het_breuschpagan, linear_reset
from statsmodels.stats.outliers_influence import OLSInfluence, variance_inflation_factor
from statsmodels.stats.stattools import jarque_bera

ALPHA = 0.05
LEVEL_OF_CHECKS = 0.01


@dataclass(frozen=True, slots=True)
class Answer:
    """What was decided.

    Attributes
    ----------
    status : str
    names : frozenset of str
        Predictors in the final model.
    rows : int
        Rows of the final fit.
    fits : int
        Models that were fitted by least squares, those inside the library's calls not counted.
    """

    status: str
    names: frozenset[str]
    rows: int
    fits: int


def loop(y: Any, design: Any, *, gate: bool, whole: tuple[Any, Any] | None = None) -> tuple[list[int], int]:
    """Backward elimination by p values; columns that are left, and how many fits it took.

    Parameters
    ----------
    y, design : array, shapes (n,) and (n, k + 1)
        The first column of the design is the constant.
    gate : bool
        Whether a whole model that is not significant gives way to the mean.
    whole : tuple of array, optional
        Outcome and design of all rows, on which the answer is tried.
    """
    left = list(range(design.shape[1]))
    fit = sm.OLS(y, design).fit()
    fits = 1
    if gate and fit.f_pvalue > ALPHA:
        left = [0]
    else:
        while len(left) > 1:
            p = fit.pvalues[1:]
            worst = int(np.argmax(p))
            if p[worst] <= ALPHA:
                break
            del left[worst + 1]
            fit = sm.OLS(y, design[:, left]).fit()
            fits += 1
    if whole is not None:
        outcome, all_rows = whole
        error = outcome - (fit.predict(all_rows[:, left]) if len(left) > 1 else y.mean())
        np.sum(error**2) / np.sum((outcome - outcome.mean()) ** 2)
    return left, fits


class _Twin:
    """Rows and columns in use, with every fit that a decision asks for."""

    def __init__(self, frame: Any, closed_form: bool) -> None:
        complete = frame.dropna()
        self.y = complete["y"].to_numpy()
        self.columns = {
            name: complete[name].to_numpy() for name in complete.columns if name not in ("y", "t")
        }
        self.closed_form = closed_form
        self.fits = 0

    def design(self, names: list[str], *more: Any) -> Any:
        return sm.add_constant(np.column_stack([*(self.columns[name] for name in names), *more]))

    def fit(self, names: list[str], *more: Any) -> Any:
        self.fits += 1
        return sm.OLS(self.y, self.design(names, *more)).fit()

    def curved(self, names: list[str], name: str) -> bool:
        """The t test of the predictor's centred square."""
        values = self.columns[name]
        return bool(self.fit(names, (values - values.mean()) ** 2).pvalues[-1] <= LEVEL_OF_CHECKS)

    def transforms(self, names: list[str]) -> None:
        for name in names:
            if not self.curved(names, name):
                continue
            own = self.columns[name]
            for power in (2, 3, 0.5):
                if power == 0.5 and own.min() < 0:
                    continue
                self.columns[name] = own**power
                self.fit(names)
                if not self.curved(names, name):
                    break
                self.columns[name] = own

    def collinearity(self, names: list[str]) -> list[str]:
        judged: set[tuple[str, str]] = set()
        while len(names) > 1:
            table = np.corrcoef([self.columns[name] for name in names])
            pairs = sorted(combinations(range(len(names)), 2), key=lambda pair: -abs(table[pair[0], pair[1]]))
            design = self.design(names)
            inflation = [variance_inflation_factor(design, at) for at in range(1, len(names) + 1)]
            if abs(table[pairs[0]]) >= 0.8 or max(inflation) >= 5.0:
                raise NotImplementedError("the benchmark's table has no predictors that say the same")
            fit = self.fit(names)
            if fit.f_pvalue > ALPHA or (fit.pvalues[1:] <= ALPHA).any():
                return names
            # A model that is significant as a whole, and nobody in it: the strongest pair is examined.
            pair = next((names[a], names[b]) for a, b in pairs if (names[a], names[b]) not in judged)
            judged.add(pair)
            alone = []
            for name, other in (pair, pair[::-1]):
                rest = [one for one in names if one != other]
                alone.append(float(self.fit(rest).pvalues[1 + rest.index(name)]))
            gone = set(pair) if min(alone) > ALPHA else {pair[1] if alone[0] <= alone[1] else pair[0]}
            names, judged = [name for name in names if name not in gone], set()
        return names

    def external(self, measures: Any, n: int, p: int) -> Any:
        """Externally studentized residuals: the library fits the model without each row in turn."""
        if not self.closed_form:
            return measures.resid_studentized_external
        internal = measures.resid_studentized_internal
        return internal * np.sqrt((n - p - 1) / (n - p - internal**2))

    def influence(self, names: list[str]) -> None:
        most = ceil(0.05 * len(self.y))
        removed = 0
        while removed < most:
            fit = self.fit(names)
            n, p = len(self.y), len(names) + 1
            measures = OLSInfluence(fit)
            cook = measures.cooks_distance[0]
            flagged = (
                (cook > 4 / n)
                | (measures.hat_matrix_diag > 3 * p / n)
                | (np.abs(self.external(measures, n, p)) > 3)
            )
            rows = np.flatnonzero(flagged)
            for row in rows[np.argsort(-cook[rows], kind="stable")]:
                kept = np.arange(n) != row
                self.fits += 1
                without = sm.OLS(self.y[kept], fit.model.exog[kept]).fit()
                if (np.abs(fit.params - without.params) / fit.bse)[1:].max() >= 1.0:
                    self.y = self.y[kept]
                    self.columns = {name: values[kept] for name, values in self.columns.items()}
                    removed += 1
                    break
            else:
                return

    def selection(self, names: list[str]) -> list[str]:
        fit = self.fit(names)
        if fit.f_pvalue > ALPHA:
            return []
        while names:
            p = fit.pvalues[1:]
            worst = int(np.argmax(p))
            if p[worst] <= ALPHA:
                break
            names = [name for at, name in enumerate(names) if at != worst]
            if names:
                fit = self.fit(names)
        return names

    def final_checks(self, names: list[str]) -> None:
        for name in names:
            self.curved(names, name)
        fit = self.fit(names)
        linear_reset(fit, power=3, use_f=True)
        jarque_bera(fit.resid)
        with warnings.catch_warnings():
            # Some versions speak of the form that it will have in a later one.
            warnings.simplefilter("ignore", FutureWarning)
            acorr_breusch_godfrey(fit, nlags=1)
        if het_breuschpagan(fit.resid, fit.model.exog)[1] <= LEVEL_OF_CHECKS:
            fit.get_robustcov_results("HC3").pvalues  # noqa: B018 - taken for the time it takes


def twin(frame: Any, *, closed_form: bool = False) -> Answer:
    """Every decision of a plan with default rules.

    Parameters
    ----------
    frame : DataFrame
        Predictors, outcome ``y`` and order ``t``, by which it is sorted; missing cells are NaN.
    closed_form : bool
        Whether externally studentized residuals are computed from the internal ones.
    """
    run = _Twin(frame, closed_form)
    names = list(run.columns)
    run.transforms(names)
    names = run.collinearity(names)
    run.influence(names)
    names = run.selection(names)
    if names:
        run.final_checks(names)
    return Answer("adopted" if names else "mean_only", frozenset(names), len(run.y), run.fits)
