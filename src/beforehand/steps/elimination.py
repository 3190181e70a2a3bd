"""The selection step for many outcomes or samples at once: the same rule, on arrays.

Each replicate carries the inverse cross-products of its working model; what a removal changes is
one column taken out of it. The step module ``selection`` is the rule as a run follows it and writes
it down; a test holds this one to the same rulings over hundreds of random plans and tables.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.special import fdtrc, fdtri, stdtr, stdtrit

from beforehand.fit.columns import FloatArray
from beforehand.plan import KeepGroup, Plan, UnlessP
from beforehand.steps.keeping import Keeping, name_of

Flags = NDArray[np.bool_]

METHODS = frozenset({"none", "backward", "backward_aic", "backward_bic"})

ADOPTED, MEAN_ONLY, INCONCLUSIVE = 0, 1, 2

# Replicates whose working models are changed together: their arrays stay near the processor.
AT_ONCE = 256


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Eliminated:
    """What selection left of B replicates with k columns and m predictors.

    Attributes
    ----------
    status : array of int8, shape (B,)
        ``ADOPTED``, ``MEAN_ONLY`` or ``INCONCLUSIVE``.
    present : array of bool, shape (B, m)
        Predictors in the final model.
    significant, chosen : array of bool, shape (B, m)
        Of those, the ones that are significant there; and these with the ones that nothing had to hold.
    slopes, errors : FloatArray, shape (B, k)
        Of the final model; 0 for a column that is not in it.
    rss : FloatArray, shape (B,)
    df : array of int64, shape (B,)
    columns : array of int64, shape (B,)
        Columns in the final model.
    full_p : FloatArray, shape (B,)
        p of the F test of the model with which selection began.
    eliminated : array of bool, shape (B,)
        Whether predictors were taken out one by one, as far as the rules allowed.
    """

    status: NDArray[np.int8]
    present: Flags
    significant: Flags
    chosen: Flags
    slopes: FloatArray
    errors: FloatArray
    rss: FloatArray
    df: NDArray[np.int64]
    columns: NDArray[np.int64]
    full_p: FloatArray
    eliminated: Flags


class Elimination:
    """Selection by a plan's rules, for models whose predictors are known blocks of columns.

    Parameters
    ----------
    plan : Plan
        Its method is one of ``METHODS`` and its standard errors are classical.
    names : sequence of str
        Predictors in the working model, in plan order.
    blocks : sequence of tuple of int
        Columns of each.
    """

    def __init__(self, plan: Plan, names: Sequence[str], blocks: Sequence[tuple[int, ...]]) -> None:
        self.plan = plan
        self._blocks = [np.array(block, dtype=np.intp) for block in blocks]
        self._sizes = np.array([len(block) for block in blocks], dtype=np.int64)
        self._single = bool((self._sizes == 1).all())
        self._first = np.array([block[0] for block in blocks], dtype=np.intp)
        keeping = Keeping(plan)
        place = {name: at for at, name in enumerate(names)}
        self._always = np.array([keeping.always(name) for name in names])
        self._bounds: list[tuple[int, float]] = []
        self._groups: list[NDArray[np.intp]] = []
        for rule in plan.keep:
            if isinstance(rule, KeepGroup):
                members = [place[name] for name in rule.at_least_one_of if name in place]
                self._groups.append(np.array(members, dtype=np.intp))
            elif isinstance(rule.rule, UnlessP) and name_of(rule.predictor) in place:
                self._bounds.append((place[name_of(rule.predictor)], rule.rule.unless_p_above))
        self._products = [
            (place[name], [place[part] for part in keeping.parts(name) if part in place])
            for name in names
            if keeping.parts(name)
        ]
        self._theory = keeping.theory
        self._limits: dict[tuple[float, int], FloatArray] = {}
        self._rows = 0

    def run(
        self, inverse: FloatArray, slopes: FloatArray, rss: FloatArray, tss: FloatArray, n: int
    ) -> Eliminated:
        """Selection on full models.

        Parameters
        ----------
        inverse : FloatArray, shape (B, k, k)
            Inverse cross-products about the means; overwritten.
        slopes : FloatArray, shape (B, k)
            Overwritten.
        rss, tss : FloatArray, shape (B,)
            Overwritten in the first case.
        n : int
            Rows of each.
        """
        self._rows = n
        count, k = slopes.shape
        m = len(self._blocks)
        present = np.ones((count, m), dtype=bool)
        columns = np.full(count, k, dtype=np.int64)
        df = n - 1 - columns
        f = (tss - rss) / k / (rss / df)
        full_p = np.asarray(fdtrc(k, df, f), dtype=np.float64)
        weak = full_p > self.plan.alpha
        status = np.full(count, ADOPTED, dtype=np.int8)
        goes_on = np.ones(count, dtype=bool)
        if not self._theory:
            status[weak] = MEAN_ONLY
            goes_on = ~weak
        elif self.plan.weak_model.with_theory == "report":
            status[weak] = INCONCLUSIVE
            goes_on = ~weak
        work = _Work(inverse, slopes, rss, columns, present, n - 1)
        if self.plan.selection.method != "none":
            active = np.flatnonzero(goes_on)
            for start in range(0, len(active), AT_ONCE):
                self._eliminate(work, active[start : start + AT_ONCE], n)
        work.present[status == MEAN_ONLY] = False
        status[~work.present.any(axis=1) & (status == ADOPTED)] = MEAN_ONLY
        adopted = status == ADOPTED
        df = n - 1 - work.columns
        s2 = work.rss / df
        diagonal = np.einsum("bii->bi", work.inverse)
        significant, held = np.zeros_like(work.present), np.zeros_like(work.present)
        if adopted.any():
            statistic = self._statistics(work, adopted)
            significant[adopted] = self._reaches(statistic, df[adopted], self.plan.alpha)
            held[adopted] = self._held(work.present[adopted], statistic, df[adopted])
            significant &= work.present
        present = work.present & adopted[:, None]
        return Eliminated(
            status=status, present=present, significant=significant, chosen=present & (significant | ~held),
            slopes=work.slopes, errors=np.sqrt(s2[:, None] * np.maximum(diagonal, 0.0)),
            rss=work.rss, df=df, columns=work.columns, full_p=full_p, eliminated=goes_on,
        )  # fmt: skip

    def _eliminate(self, whole: _Work, active: NDArray[np.intp], n: int) -> None:
        """Take predictors out of the active replicates, one from each a round, until none may leave."""
        own = whole.taken(active)
        while len(active):
            leaving = self._leaving(own, n)
            going = leaving >= 0
            if not going.all():
                whole.put(active[~going], own.taken(np.flatnonzero(~going)))
                active, leaving, own = active[going], leaving[going], own.taken(np.flatnonzero(going))
                if not len(active):
                    break
            everyone = np.arange(len(active))
            if self._single:
                own.remove(everyone, self._first[leaving])
            else:
                for size in np.unique(self._sizes[leaving]).tolist():
                    rows = everyone[self._sizes[leaving] == size]
                    blocks = np.array([self._blocks[term] for term in leaving[rows].tolist()])
                    for at in range(size):
                        own.remove(rows, blocks[:, at])
            own.present[everyone, leaving] = False
            left = own.present.any(axis=1)
            if not left.all():
                whole.put(active[~left], own.taken(np.flatnonzero(~left)))
                active, own = active[left], own.taken(np.flatnonzero(left))

    def _leaving(self, own: _Work, n: int) -> NDArray[np.intp]:
        """Which predictor leaves each replicate; -1 where none may."""
        df = n - 1 - own.columns
        statistic = self._statistics(own, slice(None))
        free = own.present & ~self._held(own.present, statistic, df)
        method = self.plan.selection.method
        if method == "backward":
            free &= ~self._reaches(statistic, df, self.plan.alpha)
            # The largest p is the smallest F where all have as many columns.
            rank = statistic if self._single else -self._p(statistic, df)
        else:
            penalty = 2.0 if method == "backward_aic" else float(np.log(n))
            rank = n * np.log1p(statistic * self._sizes / df[:, None]) - penalty * self._sizes
            free &= rank < 0.0
        rank = np.where(free, rank, np.inf)
        # Of equals the later in the plan leaves: the first from the end.
        last = rank.shape[1] - 1 - np.argmin(rank[:, ::-1], axis=1)
        return np.where(free.any(axis=1), last, -1)

    def _statistics(self, own: _Work, rows: slice | Flags) -> FloatArray:
        """F of each predictor in the working models, shape (B, m); for one column the squared t."""
        inverse, slopes = own.inverse[rows], own.slopes[rows]
        df_s2 = (own.rss[rows] / (own.n_minus_one - own.columns[rows]))[:, None]
        diagonal = np.einsum("bii->bi", inverse)
        with np.errstate(divide="ignore", invalid="ignore"):
            squared = slopes * slopes / diagonal
        if self._single:
            return np.asarray(squared[:, self._first] / df_s2)
        found = np.empty((len(slopes), len(self._blocks)))
        present = own.present[rows]
        for at, block in enumerate(self._blocks):
            if len(block) == 1:
                found[:, at] = squared[:, block[0]]
                continue
            found[:, at] = np.nan
            there = present[:, at]
            part = inverse[there][:, block[:, None], block]
            values = slopes[there][:, block]
            solved = np.linalg.solve(part, values[:, :, None])[:, :, 0]
            found[there, at] = np.einsum("bi,bi->b", values, solved) / len(block)
        return np.asarray(found / df_s2)

    def _p(self, statistic: FloatArray, df: NDArray[np.int64]) -> FloatArray:
        """P of each predictor."""
        found = np.empty_like(statistic)
        for size in np.unique(self._sizes).tolist():
            own = self._sizes == size
            values = statistic[:, own]
            if size == 1:
                found[:, own] = 2.0 * stdtr(df[:, None], -np.sqrt(values))
            else:
                found[:, own] = fdtrc(size, df[:, None], values)
        return found

    def _reaches(self, statistic: FloatArray, df: NDArray[np.int64], alpha: float) -> Flags:
        """Whether the p of each predictor is at or below alpha, by the statistic that just reaches it."""
        limits = self._limits.get((alpha, self._rows))
        if limits is None:
            # No model has more degrees of freedom than that of the mean.
            limits = self._limits[alpha, self._rows] = self._limits_of(self._rows - 1, alpha)
        with np.errstate(invalid="ignore"):
            return np.asarray(statistic >= limits[df])

    def _limits_of(self, most: int, alpha: float) -> FloatArray:
        """The statistic that just reaches alpha, for each number of degrees of freedom near the most."""
        columns = int(self._sizes.sum())
        degrees = np.arange(max(1, most - columns - 1), most + 1)
        limits = np.full((most + 1, len(self._sizes)), np.nan)
        for size in np.unique(self._sizes).tolist():
            if size == 1:
                limit = np.asarray(stdtrit(degrees, 1.0 - alpha / 2.0)) ** 2
            else:
                limit = np.asarray(fdtri(size, degrees, 1.0 - alpha))
            limits[np.ix_(degrees, self._sizes == size)] = limit[:, None]
        return limits

    def _held(self, present: Flags, statistic: FloatArray, df: NDArray[np.int64]) -> Flags:
        """What a keep rule or a product prevents from leaving."""
        held = np.broadcast_to(self._always, present.shape).copy()
        for place, bound in self._bounds:
            held[:, place] |= self._reaches(statistic, df, bound)[:, place]
        for members in self._groups:
            last = present[:, members].sum(axis=1) == 1
            held[:, members] |= present[:, members] & last[:, None]
        for product, parts in self._products:
            held[:, parts] |= present[:, product][:, None]
        return held


class _Work:
    """The working models of some replicates; arrays that change as predictors leave."""

    def __init__(
        self,
        inverse: FloatArray,
        slopes: FloatArray,
        rss: FloatArray,
        columns: NDArray[np.int64],
        present: Flags,
        n_minus_one: int = 0,
    ) -> None:
        self.inverse, self.slopes, self.rss = inverse, slopes, rss
        self.columns, self.present, self.n_minus_one = columns, present, n_minus_one
        self._change = np.empty_like(inverse)

    def taken(self, rows: NDArray[np.intp]) -> _Work:
        """A copy of some of the replicates."""
        return _Work(
            self.inverse[rows], self.slopes[rows], self.rss[rows], self.columns[rows],
            self.present[rows], self.n_minus_one,
        )  # fmt: skip

    def put(self, rows: NDArray[np.intp], done: _Work) -> None:
        """Put replicates that are done back in their places."""
        self.inverse[rows], self.slopes[rows], self.rss[rows] = done.inverse, done.slopes, done.rss
        self.columns[rows], self.present[rows] = done.columns, done.present

    def remove(self, rows: NDArray[np.intp], columns: NDArray[np.intp]) -> None:
        """Take one column out of each of some replicates."""
        own = self.inverse[rows, columns]
        pivot = own[np.arange(len(rows)), columns]
        slope = self.slopes[rows, columns]
        self.rss[rows] += slope * slope / pivot
        share = own / pivot[:, None]
        self.slopes[rows] -= share * slope[:, None]
        self.slopes[rows, columns] = 0.0
        if len(rows) == len(self.slopes):
            np.multiply(share[:, :, None], own[:, None, :], out=self._change)
            self.inverse -= self._change
        else:
            self.inverse[rows] -= share[:, :, None] * own[:, None, :]
        # Its row is exactly 0 now, its column but for rounding.
        self.inverse[rows, :, columns] = 0.0
        self.columns[rows] -= 1
