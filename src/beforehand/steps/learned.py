"""Quantities that were learned once and are to be used again: fills and exponents of an earlier run."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field


@dataclass(frozen=True, slots=True, kw_only=True)
class Learned:
    """What is not learned anew.

    Attributes
    ----------
    fills : mapping of predictor to number or level
        Means, medians and most common values. Regressions are learned anew always.
    exponents : mapping of predictor to float
        Of Box-Cox powers; the outcome goes by the name ''.
    """

    fills: Mapping[str, float | str] = field(default_factory=dict)
    exponents: Mapping[str, float] = field(default_factory=dict)


NOTHING = Learned()
