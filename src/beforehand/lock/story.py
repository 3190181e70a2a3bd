"""The whole story of one predictor or one row, as data."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Literal

from beforehand.lock.checks import InfluenceRow
from beforehand.lock.record import Scalar
from beforehand.lock.trail import FitTerm

Kind = Literal["predictor", "outcome", "row"]
Role = Literal["subject", "partner", "part", "member"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Standing:
    """How a predictor stood in one fit, or what a row's fit came to.

    Attributes
    ----------
    fit, step, why : str
        Number of the fit, the step that first asked for it, and what for.
    rows : int
        Rows used.
    terms : tuple of FitTerm
        The predictor's own coefficients with standard error, t and p; for a row those of the
        predictor that changes most without it.
    statistic, p : float or None
        |t| or partial F of the predictor as a whole, and its p.
    r_squared : float or None
        Of the fit.
    """

    fit: str
    step: str
    why: str
    rows: int
    terms: tuple[FitTerm, ...]
    statistic: float | None
    p: float | None
    r_squared: float | None


@dataclass(frozen=True, slots=True, kw_only=True)
class Entry:
    """One ruling of the story.

    Attributes
    ----------
    ruling, step, clause, verdict : str
        As in the lock.
    role : str
        What the ruling has to do with the story's subject. ``subject``: it is about it;
        ``partner``: about another of which this is the partner; ``part``: about a part of this
        product; ``member``: about a dependence or a product in which it has a share.
    subject : str
        What the ruling is about.
    says : str
        Its sentence.
    evidence : mapping of str to scalar
    limit, margin : float or None
    knife_edge : bool
    because : str or None
        The plan's own reason.
    fits : tuple of Standing
        The fits on which the ruling rests and in which the subject stands, in the ruling's order.
    """

    ruling: str
    step: str
    clause: str
    verdict: str
    role: Role
    subject: str
    says: str
    evidence: Mapping[str, Scalar]
    limit: float | None
    margin: float | None
    knife_edge: bool
    because: str | None
    fits: tuple[Standing, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class Flag:
    """One measure of a row beside the limit at which the plan flags it.

    ``limit`` is the number for the rows and coefficients of that fit, ``written`` the plan's own
    words (``4/n``); both None where the plan sets none.
    """

    measure: str
    value: float
    limit: float | None
    written: str | None
    flagged: bool


@dataclass(frozen=True, slots=True, kw_only=True)
class InAlternative:
    """How the same subject ended under declared changes of the plan."""

    alternative: str
    verdict: str
    says: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Story:
    """Everything that a lock holds about one predictor, the outcome or one row.

    Attributes
    ----------
    subject : str
        Its name or label.
    kind : str
        ``predictor``, ``outcome`` or ``row``.
    verdict : str
        How it ended: ``adopted``, ``in_model`` or ``removed`` for a predictor, ``removed`` or
        ``stays`` for a row, the rung of the ladder for the outcome.
    ruling : str or None
        The ruling that decided it.
    says : str
        The same in a sentence.
    transform : str or None
        Rung of the ladder under which it stands or stood.
    parts : tuple of str
        Of a product: its parts.
    products : tuple of str
        Products of which it is a part.
    groups : tuple of tuple of str
        Groups of the plan's keep rules to which it belongs.
    entries : tuple of Entry
        Rulings in the order of the run.
    fits : tuple of Standing
        Every fit in which it stood, in the order of the run; empty for a row.
    measures : InfluenceRow or None
        Of a row that was flagged: its measures, and the answer with and without it.
    flags : tuple of Flag
        The same measures beside their limits.
    alternatives : tuple of InAlternative
        How it ended in each declared alternative.
    """

    subject: str
    kind: Kind
    verdict: str
    ruling: str | None
    says: str
    transform: str | None
    parts: tuple[str, ...]
    products: tuple[str, ...]
    groups: tuple[tuple[str, ...], ...]
    entries: tuple[Entry, ...]
    fits: tuple[Standing, ...]
    measures: InfluenceRow | None
    flags: tuple[Flag, ...]
    alternatives: tuple[InAlternative, ...]
