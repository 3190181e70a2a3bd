"""Two plans, or two locks, side by side: what changed, and which way it leans."""

from beforehand.comparing.answers import CoefficientPair, Figure
from beforehand.comparing.locks import (
    DataPair,
    FatePair,
    HoldsPair,
    LockComparison,
    StagePair,
    lock_changes,
)
from beforehand.comparing.paths import RulingPair
from beforehand.comparing.plans import Change, plan_changes
from beforehand.comparing.rules import GRADES_IN_ORDER, Grade
from beforehand.comparing.sides import Side, read_side
from beforehand.comparing.whole import Comparison, compared, comparison

__all__ = [
    "GRADES_IN_ORDER",
    "Change",
    "CoefficientPair",
    "Comparison",
    "DataPair",
    "FatePair",
    "Figure",
    "Grade",
    "HoldsPair",
    "LockComparison",
    "RulingPair",
    "Side",
    "StagePair",
    "compared",
    "comparison",
    "lock_changes",
    "plan_changes",
    "read_side",
]
