"""What one step hands to the next: the rows in use, the working model, what has left.

A state is frozen and holds names, positions and transforms; never a table.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace

import numpy as np
from numpy.typing import NDArray

from beforehand.fit.columns import Factor, Key

Positions = NDArray[np.int64]


@dataclass(frozen=True, slots=True, order=True)
class Transform:
    """A rung of the ladder with its learned exponent (1.0 for all but ``box_cox``)."""

    rung: str = "identity"
    exponent: float = 1.0


IDENTITY = Transform()


@dataclass(frozen=True, slots=True)
class Term:
    """A predictor as it stands in a model: its plan name and its design columns.

    ``parts`` names the predictors of which a product is made; empty for a plain predictor.
    """

    name: str
    keys: tuple[Key, ...]
    kind: str = "number"
    parts: tuple[str, ...] = ()
    _hash: int = field(init=False, repr=False, compare=False)

    def __post_init__(self) -> None:
        object.__setattr__(self, "_hash", hash((self.name, self.keys, self.kind, self.parts)))

    def __hash__(self) -> int:
        """The hash, taken once."""
        return self._hash

    def __reduce__(self) -> tuple[type[Term], tuple[object, ...]]:
        """Made anew in another process, where text hashes otherwise."""
        return Term, (self.name, self.keys, self.kind, self.parts)

    @property
    def single(self) -> bool:
        """Whether the predictor is one column, and so judged by its t."""
        return len(self.keys) == 1


@dataclass(frozen=True, slots=True)
class Rows:
    """The rows in use: the base that missing data left, less the rows removed since.

    Attributes
    ----------
    base : tuple of int
        Number of rows in the base; positions below refer to it.
    gone : tuple of int
        Positions in the base that have left, ascending.
    """

    base: int
    gone: tuple[int, ...] = ()

    @property
    def n(self) -> int:
        """Rows in use."""
        return self.base - len(self.gone)

    @property
    def kept(self) -> Positions:
        """Positions of the rows in use, ascending."""
        return np.delete(np.arange(self.base, dtype=np.int64), self.gone)

    def without(self, positions: tuple[int, ...]) -> Rows:
        """The same rows less ``positions`` (positions in the base)."""
        return Rows(self.base, tuple(sorted({*self.gone, *positions})))


@dataclass(frozen=True, slots=True)
class Model:
    """What is asked of a bench: rows, outcome scale, terms; the identity of a fit."""

    rows: Rows
    outcome: Key
    terms: tuple[Term, ...]
    intercept: bool = True
    errors: str = "classical"
    # Everything about a fit is looked up by its model.
    _hash: int = field(init=False, repr=False, compare=False)
    # Design columns in plan order, without the intercept.
    keys: tuple[Key, ...] = field(init=False, repr=False, compare=False)

    def __post_init__(self) -> None:
        object.__setattr__(self, "keys", tuple(key for term in self.terms for key in term.keys))
        own = (self.rows, self.outcome, self.terms, self.intercept, self.errors)
        object.__setattr__(self, "_hash", hash(own))

    def __hash__(self) -> int:
        """The hash, taken once."""
        return self._hash

    def __reduce__(self) -> tuple[type[Model], tuple[object, ...]]:
        """Made anew in another process, where text hashes otherwise."""
        return Model, (self.rows, self.outcome, self.terms, self.intercept, self.errors)

    @property
    def names(self) -> tuple[str, ...]:
        """Predictors in the model, in plan order."""
        return tuple(term.name for term in self.terms)

    @property
    def p(self) -> int:
        """Coefficients, with the intercept."""
        return len(self.keys) + int(self.intercept)

    def term(self, name: str) -> Term:
        """The term of a predictor."""
        return next(term for term in self.terms if term.name == name)

    def without(self, *names: str) -> Model:
        """The same model less the named predictors."""
        return replace(self, terms=tuple(term for term in self.terms if term.name not in names))


@dataclass(frozen=True, slots=True, kw_only=True)
class Departure:
    """A predictor that has left, by which ruling."""

    predictor: str
    step: str
    ruling: str


@dataclass(frozen=True, slots=True, kw_only=True)
class RowDeparture:
    """A row that has left. ``label`` is the row's own."""

    label: str
    step: str
    ruling: str


@dataclass(frozen=True, slots=True, kw_only=True)
class State:
    """Everything that the next step may know of what went before.

    Attributes
    ----------
    rows : Rows
    outcome : Transform
        Scale of the outcome.
    working : tuple of str
        Predictors in the working model, in plan order; products after their parts.
    transforms : mapping of predictor name to Transform
        Only predictors that are not as they were read.
    levels : mapping of category name to its levels in use, the baseline first
    departures, row_departures : what has left, in order
    rulings_made : int
        How many rulings have been numbered so far.
    full_model : Model or None
        The model with which selection began.
    status : str
        Empty while running; else the status at which a step ended the run.
    errors : str
        The standard errors in force, ``classical`` unless the plan or a final check says other.
    extras : mapping
        What a step learned that the answer needs (near misses, smearing, joint check).
    """

    rows: Rows
    working: tuple[str, ...]
    outcome: Transform = IDENTITY
    transforms: Mapping[str, Transform] = field(default_factory=dict)
    levels: Mapping[str, tuple[str, ...]] = field(default_factory=dict)
    departures: tuple[Departure, ...] = ()
    row_departures: tuple[RowDeparture, ...] = ()
    rulings_made: int = 0
    full_model: Model | None = None
    status: str = ""
    errors: str = "classical"
    near_misses: tuple[NearMiss, ...] = ()
    cap_reached: bool = False
    unmended: tuple[str, ...] = ()

    def leaves(self, predictor: str, *, step: str, ruling: str) -> State:
        """The state after ``predictor`` has left the working model."""
        return replace(
            self,
            working=tuple(name for name in self.working if name != predictor),
            departures=(*self.departures, Departure(predictor=predictor, step=step, ruling=ruling)),
        )


@dataclass(frozen=True, slots=True, kw_only=True)
class NearMiss:
    """A predictor that nearly reached alpha, with the sample its effect would need.

    ``rows_needed`` is None where no sample of a stated size would do.
    """

    predictor: str
    p: float
    partial_f2: float
    rows_needed: int | None


def factor_of(column: str, transform: Transform) -> Factor:
    """A numeric column under its transform."""
    return Factor(column=column, rung=transform.rung, exponent=transform.exponent)


def blocks_of(model: Model) -> Mapping[str, tuple[Key, ...]]:
    """Columns of each predictor, in plan order."""
    return {term.name: term.keys for term in model.terms}


def column_name(key: Key | None) -> str:
    """A design column as it is named in the record: predictor, level, parts."""
    if key is None:
        return "intercept"
    return " × ".join(
        f"{factor.column} = {factor.level}" if factor.level else factor.column for factor in key.factors
    )
