"""One replicate: the steps of the plan on one base, and what they came to.

The steps are those of a run. They ask the quick bench first; where doubles do not carry an answer,
the whole replicate is run on the recording bench, so that no ruling rests on rounding.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np

from beforehand.fit.columns import FloatArray
from beforehand.fit.doubles import NotQuick
from beforehand.plan import Plan
from beforehand.running import final_fit, follow, order_column, ranks_in_base, require_enough
from beforehand.steps.bench import Bench, Fitted
from beforehand.steps.ground import Ground
from beforehand.steps.missing_data import Base
from beforehand.steps.quick import QuickBench
from beforehand.steps.recording import RecordingBench
from beforehand.steps.rulings import Ruling
from beforehand.steps.source import TableSource
from beforehand.steps.state import Model, State
from beforehand.table import Table


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Ended:
    """How one replicate ended.

    Attributes
    ----------
    status : str
        As of a run.
    state : State
    rulings : tuple of Ruling
        Those of the steps after missing data.
    final : Fitted or None
        None where the plan stopped.
    residual : callable
        Residuals of the final model's rows, on the scale of its outcome.
    quick : bool
        Whether doubles carried every answer.
    """

    status: str
    state: State
    rulings: tuple[Ruling, ...]
    final: Fitted | None
    residual: Callable[[Model], FloatArray]
    quick: bool


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Setting:
    """What the steps of a replicate start from: a base, and what every outcome on it shares.

    Attributes
    ----------
    plan : Plan
    table : Table
    base : Base
    state : State
        As the missing-data step left it.
    source : TableSource
    made : tuple of Ruling
        Those of missing data.
    ground : Ground or None
        None for a model that doubles are not used for.
    """

    plan: Plan
    table: Table
    base: Base
    state: State
    source: TableSource
    made: tuple[Ruling, ...]
    ground: Ground | None

    def fresh(self) -> Setting:
        """The same setting with nothing computed yet.

        What a ground has computed so far decides in which shapes the next numbers are multiplied, and
        so their last digits: a block of replicates starts afresh wherever it is run.
        """
        return setting_of(self.plan, self.table, self.base, self.state, self.made)

    def __reduce__(self) -> tuple[Callable[..., Setting], tuple[object, ...]]:
        """Made anew in another process, without what was computed so far."""
        return setting_of, (self.plan, self.table, self.base, self.state, self.made)


def setting_of(plan: Plan, table: Table, base: Base, state: State, made: tuple[Ruling, ...]) -> Setting:
    """The setting of a base."""
    source = TableSource.of(table, base)
    ground: Ground | None = None
    if plan.intercept and not state.status:
        ground = Ground(
            plan,
            source,
            order=ranks_in_base(table, order_column(plan), base),
            groups=ranks_in_base(table, getattr(plan.errors, "cluster_by", None), base),
        )
        state = replace(state, errors=ground.designer.errors)
    return Setting(plan=plan, table=table, base=base, state=state, source=source, made=made, ground=ground)


def run_trial(setting: Setting, outcome: FloatArray, cross: FloatArray | None = None) -> Ended:
    """Run the steps of the plan for one outcome over the base.

    Parameters
    ----------
    setting : Setting
    outcome : FloatArray, shape (n,)
        In the order of the base.
    cross : FloatArray, optional
        Cross-products of the ground's first columns with the outcome about its mean.

    Raises
    ------
    BeforehandError
        Where a run would end in a fault: too few rows, an outcome of one value.
    """
    if setting.state.status:
        return Ended(
            status=setting.state.status, state=setting.state, rulings=(), final=None,
            residual=_nothing, quick=True,
        )  # fmt: skip
    if setting.ground is not None:
        try:
            require_enough(setting.plan, setting.table.file, setting.ground.model(setting.state), outcome)
            quick = QuickBench(setting.ground, outcome, cross)
            return _ended(setting.state, setting.plan, quick, quick.numbers.residual, quick=True)
        except NotQuick:
            pass
    return _recorded(setting, outcome)


def _recorded(setting: Setting, outcome: FloatArray) -> Ended:
    """The same on the recording bench, whose record nobody reads."""
    plan = setting.plan
    source = setting.source.with_column(plan.outcome.column, outcome)
    bench = RecordingBench(
        plan,
        source,
        order=ranks_in_base(setting.table, order_column(plan), setting.base),
        groups=ranks_in_base(setting.table, getattr(plan.errors, "cluster_by", None), setting.base),
    )
    state = replace(setting.state, errors=bench.errors)
    require_enough(plan, setting.table.file, bench.design(state), outcome)
    return _ended(state, plan, bench, lambda model: bench.values(model).residual, quick=False)


def _ended(
    state: State, plan: Plan, bench: Bench, residual: Callable[[Model], FloatArray], *, quick: bool
) -> Ended:
    """The steps, and the fit that the answer rests on."""
    state, rulings = follow(state, plan, bench)
    status = state.status or ("adopted" if state.working else "mean_only")
    final = None if status == "stopped" else final_fit(state, bench)
    return Ended(
        status=status, state=state, rulings=rulings, final=final, residual=residual, quick=quick
    )  # fmt: skip


def _nothing(_: Model) -> FloatArray:
    return np.empty(0)
