"""Many replicates at once, for plans whose steps select and do nothing else.

Where the steps between missing data and selection are not asked for and no cell of the base was
filled, all that a replicate needs is its cross-products. They come from one multiplication for a
block of replicates, and the eliminations run side by side.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.special import fdtrc

from beforehand.fit.columns import FloatArray
from beforehand.fit.doubles import SMALLEST_PIVOT, SMALLEST_REST, NotQuick
from beforehand.rehearsing.observed import SeenRuling
from beforehand.rehearsing.trial import Setting
from beforehand.rehearsing.trials import STATUSES, Subjects, Trials, empty
from beforehand.steps.elimination import ADOPTED, MEAN_ONLY, METHODS, Eliminated, Elimination
from beforehand.steps.state import Model, column_name

# Cells of the products of columns that are made at a time.
BLOCK_CELLS = 2_000_000

# Grounds of rulings whose falling can be read off the arrays.
_OF_MODEL = frozenset({"model_weak", "model_significant", "weak_without_theory", "full_model_stands"})
_OF_NAME = frozenset({"stays", "stays_above_alpha", "leaves_backward", "leaves_aic", "leaves_bic"})

_STATUS = ("adopted", "mean_only", "inconclusive")


@dataclass(frozen=True, slots=True, eq=False)
class Batch:
    """A base and its full model, on which replicates are eliminated side by side.

    Attributes
    ----------
    setting : Setting
    subjects : Subjects
    model : Model
        The full model.
    values : FloatArray, shape (n, k)
        Its columns over the base, about their means and of unit length.
    length, centre : FloatArray, shape (k,)
        What brings them back to their own units.
    elimination : Elimination
    """

    setting: Setting
    subjects: Subjects
    model: Model
    values: FloatArray
    length: FloatArray
    centre: FloatArray
    gram: FloatArray
    inverse: FloatArray
    elimination: Elimination

    @classmethod
    def of(cls, setting: Setting, subjects: Subjects) -> Batch | None:
        """The batch of a setting; None where replicates must be run one by one."""
        plan, ground = setting.plan, setting.ground
        if ground is None or setting.state.status or plan.selection.method not in METHODS:
            return None
        if set(plan.steps) - {"missing_data"} != {"selection"} or plan.errors != "classical":
            return None
        model = ground.model(setting.state)
        if not model.terms or not all(term.keys for term in model.terms):
            return None
        if model.rows.n - model.p < 1:
            return None
        try:
            design = ground.columns.design(model.keys, ())
        except NotQuick:
            return None
        blocks: list[tuple[int, ...]] = []
        for term in model.terms:
            start = sum(map(len, blocks))
            blocks.append(tuple(range(start, start + len(term.keys))))
        return cls(
            setting=setting, subjects=subjects, model=model, values=ground.columns.values[:, design.places],
            length=ground.columns.length(design.places), centre=ground.columns.centre(design.places),
            gram=design.gram, inverse=design.inverse, elimination=Elimination(plan, model.names, blocks),
        )  # fmt: skip

    def outcomes(self, outcomes: FloatArray) -> tuple[Trials, NDArray[np.intp]]:
        """Replicates that differ in their outcome only.

        Parameters
        ----------
        outcomes : FloatArray, shape (B, n)

        Returns
        -------
        tuple of Trials and array of int
            The second names the replicates that doubles do not carry.
        """
        n = self.values.shape[0]
        mean = outcomes.mean(axis=1)
        about = outcomes - mean[:, None]
        cross = about @ self.values
        total = np.einsum("bi,bi->b", about, about)
        inverse = np.broadcast_to(self.inverse, (len(cross), *self.inverse.shape)).copy()
        found, clear = self._select(inverse, cross, total, n)
        trials = self._trials(found, total, n, mean, np.zeros_like(cross))
        return trials, np.flatnonzero(~clear)

    def samples(
        self, weights: FloatArray, outcome: FloatArray, seen: Sequence[SeenRuling] = ()
    ) -> tuple[Trials, NDArray[np.intp]]:
        """Replicates that are samples of the rows of the base.

        Parameters
        ----------
        weights : FloatArray, shape (B, n)
            How often each row is in each sample; every sample has as many rows.
        outcome : FloatArray, shape (n,)
        seen : sequence of SeenRuling
            Rulings of the real run, of a kind that ``tells``.
        """
        n = round(float(weights[0].sum()))
        k = self.values.shape[1]
        own_mean = float(outcome.mean())
        about = outcome - own_mean
        sums, products = self._sums(weights, about)
        means = sums / n
        centred = products - n * means[:, :, None] * means[:, None, :]
        gram, cross, total = centred[:, :k, :k], centred[:, :k, k], centred[:, k, k]
        inverse, sound = _inverses(gram)
        found, clear = self._select(inverse, cross, total, n)
        trials = self._trials(found, total, n, own_mean + means[:, k], means[:, :k], seen)
        self._elsewhere(trials, found, means, about)
        return trials, np.flatnonzero(~(clear & sound))

    def _sums(self, weights: FloatArray, about: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Weighted sums of the columns and the outcome, and of their products."""
        n, k = self.values.shape
        upper = np.triu_indices(k + 1)
        width = len(upper[0]) + k + 1
        total = np.zeros((len(weights), width))
        step = max(1, BLOCK_CELLS // width)
        for start in range(0, n, step):
            rows = slice(start, min(start + step, n))
            part = np.column_stack([self.values[rows], about[rows]])
            wide = np.empty((len(part), width))
            np.multiply(part[:, upper[0]], part[:, upper[1]], out=wide[:, k + 1 :])
            wide[:, : k + 1] = part
            total += weights[:, rows] @ wide
        products = np.empty((len(weights), k + 1, k + 1))
        products[:, upper[0], upper[1]] = total[:, k + 1 :]
        products[:, upper[1], upper[0]] = total[:, k + 1 :]
        return total[:, : k + 1], products

    def _select(
        self, inverse: FloatArray, cross: FloatArray, total: FloatArray, n: int
    ) -> tuple[Eliminated, NDArray[np.bool_]]:
        """Full models, then selection; and which of them doubles carry."""
        slopes = np.matmul(inverse, cross[:, :, None])[:, :, 0]
        rss = total - np.einsum("bi,bi->b", cross, slopes)
        with np.errstate(invalid="ignore"):
            clear = rss > SMALLEST_REST * total
        # Something to divide by where nothing is left; such a replicate is run again on its own.
        rss = np.where(clear, rss, 1.0)
        return self.elimination.run(inverse, slopes, rss, np.where(clear, total, 2.0), n), clear

    def _trials(
        self,
        found: Eliminated,
        total: FloatArray,
        n: int,
        mean: FloatArray,
        shift: FloatArray,
        seen: Sequence[SeenRuling] = (),
    ) -> Trials:
        """What was found, in its own units.

        ``mean`` and ``shift`` are the means of the outcome and of the columns in each replicate.
        """
        count = len(total)
        trials = empty(count, self.subjects, len(seen))
        for place, ruling in enumerate(seen):
            trials.same_rulings[:, place] = self._ruled(found, ruling)
        codes = np.array([STATUSES.index(name) for name in _STATUS], dtype=np.int8)
        trials.status[:] = codes[found.status]
        selects = self.setting.plan.selection.method != "none"
        at = [self.subjects.names.index(name) for name in self.model.names]
        trials.significant[:, at] = found.significant
        trials.present[:, at] = found.present
        trials.adopted[:, at] = found.chosen if selects else found.significant
        adopted = found.status == ADOPTED
        in_model = np.zeros((count, len(self.model.keys)), dtype=bool)
        start = 0
        for place, term in enumerate(self.model.terms):
            in_model[:, start : start + len(term.keys)] = found.present[:, place, None]
            start += len(term.keys)
        columns = [self.subjects.columns.index(column_name(key)) for key in self.model.keys]
        trials.estimates[:, columns] = np.where(in_model, found.slopes / self.length, np.nan)
        trials.errors[:, columns] = np.where(in_model, found.errors / self.length, np.nan)
        slopes = np.where(in_model, found.slopes, 0.0)
        level = mean - np.einsum("bi,bi->b", slopes, shift + self.centre / self.length)
        trials.intercept[adopted] = level[adopted]
        model_df = np.where(adopted, found.columns, 0)
        df = n - 1 - model_df
        rss = np.where(adopted, found.rss, total)
        trials.rows[:] = n
        trials.df[:] = np.where(adopted, df, np.nan)
        trials.r_squared[:] = 1.0 - rss / total
        trials.adjusted_r_squared[:] = 1.0 - (rss / df) / (total / (n - 1))
        with np.errstate(divide="ignore", invalid="ignore"):
            f = (total - rss) / model_df / (rss / df)
            trials.model_p[:] = np.where(adopted, fdtrc(np.maximum(model_df, 1), df, f), np.nan)
        trials.full_p[:] = found.full_p
        return trials

    def tells(self, seen: Sequence[SeenRuling]) -> bool:
        """Whether it is known of each of some rulings in which replicates it fell."""
        return all(
            ruling.step == "selection"
            and (
                ruling.ground in _OF_MODEL
                or (ruling.ground in _OF_NAME and ruling.subject in self.model.names)
            )
            for ruling in seen
        )

    def _ruled(self, found: Eliminated, ruling: SeenRuling) -> NDArray[np.bool_]:
        """In which replicates a ruling fell."""
        weak = found.full_p > self.setting.plan.alpha
        adopted = np.asarray(found.status == ADOPTED)
        if ruling.ground in ("model_weak", "model_significant"):
            return np.asarray(weak if ruling.ground == "model_weak" else ~weak)
        if ruling.ground == "weak_without_theory":
            return np.asarray(weak & (found.status == MEAN_ONLY))
        if ruling.ground == "full_model_stands":
            return np.asarray(adopted)
        at = self.model.names.index(ruling.subject)
        present, significant = found.present[:, at], found.significant[:, at]
        fell: dict[str, NDArray[np.bool_]] = {
            "stays": adopted & present & significant,
            "stays_above_alpha": adopted & present & ~significant,
        }
        left: NDArray[np.bool_] = found.eliminated & ~present
        return fell.get(ruling.ground, left)

    def _elsewhere(self, trials: Trials, found: Eliminated, means: FloatArray, about: FloatArray) -> None:
        """R² and slope of each replicate's answer on the whole base, from its cross-products."""
        k = self.values.shape[1]
        adopted = (found.status == ADOPTED)[:, None]
        slopes = np.where(adopted, found.slopes, 0.0)
        level = means[:, k] - np.einsum("bi,bi->b", slopes, means[:, :k])
        total, cross = float(about @ about), about @ self.values
        with_outcome = slopes @ cross
        own = np.einsum("bi,ij,bj->b", slopes, self.gram, slopes)
        error = total - 2.0 * with_outcome + own + len(about) * level * level
        trials.here[:] = trials.r_squared
        trials.elsewhere[:] = 1.0 - error / total
        with np.errstate(divide="ignore", invalid="ignore"):
            trials.slope[:] = np.where(own > 1e-20 * total, with_outcome / own, np.nan)


def _inverses(gram: FloatArray) -> tuple[FloatArray, NDArray[np.bool_]]:
    """Inverse of each of some cross-products, and whether doubles carry it."""
    diagonal = np.einsum("bii->bi", gram)
    sound = (diagonal > SMALLEST_PIVOT).all(axis=1)
    length = np.sqrt(np.where(diagonal > SMALLEST_PIVOT, diagonal, 1.0))
    unit = gram / length[:, :, None] / length[:, None, :]
    unit[~sound] = np.eye(gram.shape[1])
    try:
        inverse = np.linalg.inv(unit)
    except np.linalg.LinAlgError:
        inverse = np.empty_like(unit)
        for place, one in enumerate(unit):
            try:
                inverse[place] = np.linalg.inv(one)
            except np.linalg.LinAlgError:
                inverse[place], sound[place] = np.eye(len(one)), False
    with np.errstate(divide="ignore", invalid="ignore"):
        tolerance = 1.0 / np.einsum("bii->bi", inverse)
    sound &= ((tolerance > SMALLEST_PIVOT) & (tolerance <= 1.0 + 1e-6)).all(axis=1)
    inverse[~sound] = np.eye(gram.shape[1])
    return inverse / length[:, :, None] / length[:, None, :], sound
