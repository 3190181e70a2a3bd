"""Exact linear dependence: looked for before the first fit of any step, never passed over.

The later predictor of the dependent set leaves, keep rules first; where every member is held,
the run stops and says so. A pseudo-inverse would hide the choice.
"""

from __future__ import annotations

from dataclasses import replace

from beforehand.plan import Plan
from beforehand.steps.bench import Bench, Linked
from beforehand.steps.keeping import Keeping
from beforehand.steps.rulings import Ruling, Rulings
from beforehand.steps.state import State


def remove_dependent(state: State, plan: Plan, bench: Bench, step: str) -> tuple[State, tuple[Ruling, ...]]:
    """Take out one predictor after another until the columns of the working model are independent."""
    rulings = Rulings(step, state.rulings_made)
    keeping = Keeping(plan)
    while state.working:
        model = bench.design(state)
        linked = bench.dependence(model)
        if linked is None:
            break
        state = _resolve(state, keeping, linked, rulings, step)
        if state.status:
            break
    return replace(state, rulings_made=rulings.count), tuple(rulings.made)


def _resolve(state: State, keeping: Keeping, linked: Linked, rulings: Rulings, step: str) -> State:
    """Remove the latest member that nothing holds, or stop."""
    evidence: dict[str, float | str | int | bool | None] = {"column": linked.column}
    evidence |= {f"weight of {name}": weight for name, weight in linked.weights}
    ground = "constant" if linked.constant else "dependent"
    # A product hangs on its parts: where a part is determined, its product is the later predictor.
    members = [
        name
        for name in reversed(state.working)
        if name in linked.members or any(part in linked.members for part in keeping.parts(name))
    ]
    for name in members:
        hold = keeping.hold(name, state.working, None)
        if hold is None:
            ruling = rulings.add("collinearity", name, f"leaves_{ground}", evidence=evidence)
            return state.leaves(name, step=step, ruling=ruling.id)
        rulings.add(hold.clause, name, hold.ground, evidence=evidence, because=hold.because)
    rulings.add("collinearity", linked.predictor, f"stops_{ground}", evidence=evidence)
    return replace(state, status="stopped")
