"""A ruling: one decision, the clause it rests on, the evidence, the limit and the margin."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

# Evidence is recorded to ten digits; a decision that hangs on less than this share of its limit
# could fall otherwise by rounding alone.
KNIFE_EDGE_RELATIVE = 1e-9

Evidence = Mapping[str, float | int | str | bool | None]


@dataclass(frozen=True, slots=True, kw_only=True)
class Ruling:
    """One decision of a step.

    Attributes
    ----------
    id : str
        ``R001`` and on, in the order of the run.
    step, clause : str
        The step and the place in the plan on which the decision rests.
    subject : str
        The predictor, row or check that the decision is about.
    ground : str
        What was decided and on what ground, as a code; the sentence and the verdict are made from it.
    fits, checks : tuple of str
        What the evidence can be recomputed from.
    evidence : mapping
        Named numbers; names of others where the decision is about a pair.
    limit, margin : float or None
        The number in the plan and the distance of the evidence from it.
    knife_edge : bool
        The margin is within the numerical error of the evidence.
    because : str or None
        The plan's own reason, where a keep rule or an eligibility line decided.
    """

    id: str
    step: str
    clause: str
    subject: str
    ground: str
    fits: tuple[str, ...] = ()
    checks: tuple[str, ...] = ()
    evidence: Evidence = field(default_factory=dict)
    limit: float | None = None
    margin: float | None = None
    knife_edge: bool = False
    because: str | None = None


def margin_of(value: float | None, limit: float | None) -> tuple[float | None, bool]:
    """Distance of ``value`` from ``limit``, and whether rounding alone could cross it."""
    if value is None or limit is None:
        return None, False
    margin = abs(value - limit)
    return margin, margin <= KNIFE_EDGE_RELATIVE * (abs(value) + abs(limit))


@dataclass(slots=True)
class Rulings:
    """Numbers and collects the rulings of one step; local to the call that made it."""

    step: str
    made_before: int
    made: list[Ruling] = field(default_factory=list)

    @property
    def count(self) -> int:
        """How many rulings the run has made, this step's included."""
        return self.made_before + len(self.made)

    def add(
        self,
        clause: str,
        subject: str,
        ground: str,
        *,
        fits: tuple[str, ...] = (),
        checks: tuple[str, ...] = (),
        evidence: Evidence | None = None,
        value: float | None = None,
        limit: float | None = None,
        because: str | None = None,
    ) -> Ruling:
        """Make the next ruling; ``value`` is the piece of evidence that is held against ``limit``."""
        margin, knife_edge = margin_of(value, limit)
        ruling = Ruling(
            id=f"R{self.count + 1:03d}",
            step=self.step,
            clause=clause,
            subject=subject,
            ground=ground,
            fits=fits,
            checks=checks,
            evidence=dict(evidence or {}),
            limit=limit,
            margin=margin,
            knife_edge=knife_edge,
            because=because,
        )
        self.made.append(ruling)
        return ruling
