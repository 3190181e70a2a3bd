"""What the screen needs to know of the plan, read from the copy that a lock carries."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from beforehand.lock import Lock

PRODUCT = " × "


@dataclass(frozen=True, slots=True, kw_only=True)
class Planned:
    """The parts of a plan that a text about its run refers to.

    Attributes
    ----------
    alpha : float
    multiplicity : str
    outcome : str
    unit : str
        The outcome's unit; empty where the plan gives none.
    units, baselines, roles : mapping of predictor name to text
        Only what the plan gives.
    order : mapping of predictor name to its place in the plan, products after the plain ones
    selects : bool
        Whether predictors are selected.
    """

    alpha: float
    multiplicity: str
    outcome: str
    unit: str
    units: Mapping[str, str]
    baselines: Mapping[str, str]
    roles: Mapping[str, str]
    order: Mapping[str, int]
    selects: bool

    @property
    def level(self) -> str:
        """Level of the intervals, as ``95 %``."""
        return f"{100 * (1 - self.alpha):.10g} %"

    def place(self, predictor: str | None) -> int:
        """A sort key: the plan's order, what it does not name last."""
        return self.order.get(predictor or "", len(self.order))


def planned(lock: Lock) -> Planned:
    """Read the written-out plan of a lock."""
    written: Mapping[str, Any] = lock.plan.written
    predictors = [entry for entry in written.get("predictors") or () if isinstance(entry, Mapping)]
    derived = {
        str(entry["column"]): str(entry["unit"]) for entry in written.get("derive") or () if entry.get("unit")
    }
    units = derived | {str(entry["column"]): str(entry["unit"]) for entry in predictors if entry.get("unit")}
    baselines = {
        str(entry["column"]): str(entry.get("baseline") or entry["levels"][0])
        for entry in predictors
        if entry.get("baseline") or entry.get("levels")
    }
    names = [str(entry["column"]) for entry in predictors]
    names += [PRODUCT.join(map(str, parts)) for parts in written.get("products") or ()]
    outcome: Mapping[str, Any] = written.get("outcome") or {}
    name = str(outcome.get("column") or "the outcome")
    return Planned(
        alpha=float(written.get("alpha", 0.05)),
        multiplicity=str(written.get("multiplicity", "none")),
        outcome=name,
        unit=str(outcome.get("unit") or derived.get(name, "")),
        units=units,
        baselines=baselines,
        roles={str(entry["column"]): str(entry.get("role", "candidate")) for entry in predictors},
        order={name: place for place, name in enumerate(names)},
        selects="selection" in (written.get("steps") or ())
        and (written.get("selection") or {}).get("method") != "none",
    )
