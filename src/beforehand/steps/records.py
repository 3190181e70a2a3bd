"""What a run leaves behind: every fit, check and table, in the order first asked for."""

from __future__ import annotations

from dataclasses import dataclass, field

from beforehand.fit.conditioning import Condition
from beforehand.fit.results import Check, Fit
from beforehand.steps.state import Model


@dataclass(frozen=True, slots=True, kw_only=True)
class RecordedFit:
    """A fit with the step that first asked for it and why."""

    id: str
    step: str
    why: str
    model: Model
    fit: Fit


@dataclass(frozen=True, slots=True, kw_only=True)
class RecordedCheck:
    """A check with its place in the run."""

    id: str
    stage: str
    subject: str | None
    fit: str
    alpha: float
    check: Check


@dataclass(frozen=True, slots=True, kw_only=True)
class CollinearityRecord:
    """Correlations, variance inflation and condition indices of one model at one stage."""

    stage: str
    model: Model
    correlations: tuple[tuple[str, str, float], ...]
    inflation: tuple[tuple[str, float], ...]
    condition: Condition


@dataclass(slots=True)
class Record:
    """Everything that a run leaves behind, in the order first asked for."""

    fits: list[RecordedFit] = field(default_factory=list)
    checks: list[RecordedCheck] = field(default_factory=list)
    collinearity: list[CollinearityRecord] = field(default_factory=list)
    tables: dict[str, object] = field(default_factory=dict)
