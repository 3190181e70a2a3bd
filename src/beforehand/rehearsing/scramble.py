"""A table whose outcome is shuffled, for a run that shows no result (after MacCoun & Perlmutter 2015)."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from beforehand.lock import Lock, Scrambled
from beforehand.lock.writing import sealed_lock
from beforehand.plan import Plan
from beforehand.rehearsing.seeds import generator
from beforehand.table import Table

SAYS = "The rows of the outcome were shuffled before anything was fitted: nothing here is a result."


def scrambled_table(table: Table, plan: Plan, seed: int) -> Table:
    """The table with the outcomes that it has dealt out among the rows that have one.

    An analysis is debugged while its result cannot be seen (MacCoun & Perlmutter 2015, Nature
    526:187-189).
    """
    name = plan.outcome.column
    outcome = table.columns[name]
    values = np.array(outcome.values, dtype=np.float64)
    there = ~np.isnan(values)
    values[there] = generator(seed, "scrambled", 0).permutation(values[there])
    return replace(table, columns={**table.columns, name: replace(outcome, values=values)})


def marked(lock: Lock, seed: int) -> Lock:
    """The lock of such a run, which says so itself."""
    return sealed_lock(lock.model_copy(update={"scrambled": Scrambled(seed=seed, says=SAYS)}))
