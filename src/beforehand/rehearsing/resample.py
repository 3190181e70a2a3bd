"""The worlds of other samples: halves of the rows, and rows drawn with replacement.

Halves tell how stable the choice of predictors is: a sample with replacement has rows twice, and
noise is found in it more often than in the table (Meinshausen & Bühlmann 2010, JRSS B 72:417-473, on
halves; Efron 1979 on samples with replacement). Those with replacement tell bias, spread and
optimism.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from beforehand.rehearsing.batch import Batch
from beforehand.rehearsing.observed import SeenRuling
from beforehand.rehearsing.rows import clusters_of, half, sample_with_replacement, table_of_rows
from beforehand.rehearsing.seeds import generator
from beforehand.rehearsing.stage import Stage, table_trials
from beforehand.rehearsing.trials import Trials, put
from beforehand.table import Table

HALF_SAMPLES = "half_samples"
BOOTSTRAP = "bootstrap"


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class SampleWorld:
    """Samples of the rows of a table, on each of which the whole plan is run anew.

    Attributes
    ----------
    name : str
        ``half_samples`` or ``bootstrap``.
    stage : Stage
        Of the table itself; the answers of samples with replacement are tried on it.
    seen : tuple of SeenRuling
        Rulings of the real run.
    seed : int
    """

    name: str
    stage: Stage
    seen: tuple[SeenRuling, ...]
    seed: int

    def trials(self, first: int, last: int) -> Trials:
        """What the plan comes to in some replicates."""
        batch = self._batch()
        if batch is None:
            return self._one_by_one(range(first, last))
        setting = self.stage.setting
        weights = np.empty((last - first, self.stage.n_rows))
        for place, replicate in enumerate(range(first, last)):
            weights[place] = self._weights(replicate)
        trials, rest = batch.samples(weights, setting.source.raw(setting.plan.outcome.column), self.seen)
        if len(rest):
            put(trials, rest, self._one_by_one([first + int(place) for place in rest]))
        return trials

    @property
    def side_by_side(self) -> bool:
        """Whether samples need not be run one by one."""
        return self._batch() is not None

    def table(self, replicate: int) -> Table:
        """The table of one replicate."""
        setting = self.stage.setting
        rng = generator(self.seed, self.name, replicate)
        if self.name == HALF_SAMPLES:
            return table_of_rows(setting.table, half(setting.plan, setting.table, rng))
        return sample_with_replacement(setting.plan, setting.table, rng)

    def _batch(self) -> Batch | None:
        """Samples side by side, where every row of the table is in the base as it was read."""
        setting = self.stage.setting
        whole = len(setting.base.kept) == setting.table.n_rows and not setting.base.fills
        if not whole or clusters_of(setting.plan, setting.table) is not None:
            return None
        batch = Batch.of(setting.fresh(), self.stage.subjects)
        return None if batch is None or not batch.tells(self.seen) else batch

    def _weights(self, replicate: int) -> np.ndarray[tuple[int], np.dtype[np.float64]]:
        """How often each row is in a sample: the same draw as that of its table."""
        setting = self.stage.setting
        rng = generator(self.seed, self.name, replicate)
        n = setting.table.n_rows
        if self.name == HALF_SAMPLES:
            found = np.zeros(n)
            found[half(setting.plan, setting.table, rng)] = 1.0
            return found
        return np.bincount(rng.integers(0, n, n), minlength=n).astype(np.float64)

    def _one_by_one(self, replicates: Sequence[int]) -> Trials:
        """Each sample by the steps themselves."""
        setting = self.stage.setting
        tables = (self.table(replicate) for replicate in replicates)
        elsewhere = setting if self.name == BOOTSTRAP else None
        return table_trials(setting.plan, tables, len(replicates), self.stage.subjects, self.seen, elsewhere)
