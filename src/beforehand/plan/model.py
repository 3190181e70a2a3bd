"""The plan: every decision of one analysis, as data."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Annotated, Any, ClassVar, Literal

from pydantic import AfterValidator, Field, PlainSerializer, PrivateAttr

from beforehand.plan.block import Block, frozen
from beforehand.plan.blocks import (
    Amendment,
    Assumptions,
    Collinearity,
    Errors,
    Expects,
    FinalChecks,
    Influence,
    MissingData,
    Refresh,
    Rehearsal,
    Selection,
    Transforms,
    WeakModel,
)
from beforehand.plan.numbers import LEVEL_OF_TEST, Whole
from beforehand.plan.scalars import TEXT, TRUTH, WORD, Pair
from beforehand.plan.variables import Data, Derived, Eligibility, KeepRule, Outcome, Predictor

# The version of the language that this program reads.
LANGUAGE = 1

StepName = Literal["missing_data", "transforms", "collinearity", "influence", "selection", "final_checks"]
STEPS: tuple[StepName, ...] = (
    "missing_data",
    "transforms",
    "collinearity",
    "influence",
    "selection",
    "final_checks",
)


@dataclass(frozen=True, slots=True, kw_only=True)
class PlanOrigin:
    """Where a plan was read.

    Attributes
    ----------
    path : Path or None
        The file, as the caller named it; None for a text in memory.
    name : str
        How faults and records name it.
    lines : mapping of str to int
        Path of a field (``predictors[2].range``) to its line, from 1.
    """

    path: Path | None
    name: str
    lines: Mapping[str, int]


class Plan(Block):
    """A plan: the decisions of one analysis, made before its results are seen."""

    words: ClassVar[tuple[str, ...]] = ("title", "question", "written_by", "amendments")

    language: Annotated[Literal[1], Whole(at_least=LANGUAGE, at_most=LANGUAGE)] = Field(
        description="Version of the plan language."
    )
    title: Annotated[str, TEXT] = Field(description="What the analysis is about, in one line.")
    question: Annotated[str, TEXT] = Field(description="The question that the decision maker asks.")
    written_by: Annotated[str, TEXT] | None = Field(default=None, description="Who wrote the plan.")
    data: Data = Field(description="The file that holds the table.")
    purpose: Annotated[Literal["explain", "predict", "describe"], WORD] = Field(
        default="explain", description="What the answer is for."
    )
    eligibility: tuple[Eligibility, ...] = Field(
        default=(), description="Which rows are the population; each line is counted in the record."
    )
    derive: tuple[Derived, ...] = Field(
        default=(), description="New columns, computed in this order before anything else."
    )
    outcome: Outcome = Field(description="What is explained or predicted.")
    predictors: tuple[Predictor, ...] = Field(
        description="The candidates, the more important first: ties go to the earlier.", min_length=1
    )
    products: tuple[Annotated[tuple[str, str], Pair()], ...] = Field(
        default=(), description="Interactions, each a pair of predictors."
    )
    keep: tuple[KeepRule, ...] = Field(
        default=(), description="What theory says must stay: no step may remove it."
    )
    alpha: Annotated[float, LEVEL_OF_TEST] = Field(
        default=0.05, description="Level of significance; intervals are at 1 - alpha."
    )
    multiplicity: Annotated[Literal["none", "holm", "benjamini_hochberg"], WORD] = Field(
        default="none", description="Adjustment over the focal predictors in the final table."
    )
    intercept: Annotated[bool, TRUTH] = Field(
        default=True, description="false fits a regression through the origin."
    )
    steps: tuple[Annotated[StepName, WORD], ...] = Field(
        default=STEPS, description="Which steps are taken, in this order; [] fits the full model once."
    )
    missing_data: MissingData = Field(
        default=MissingData.defaults(), description="What happens to missing cells."
    )
    assumptions: Assumptions = Field(
        default=Assumptions.defaults(), description="Which checks, at which level."
    )
    transforms: Transforms = Field(default=Transforms.defaults(), description="The ladder for predictors.")
    collinearity: Collinearity = Field(
        default=Collinearity.defaults(), description="Predictors that say the same."
    )
    influence: Influence = Field(
        default=Influence.defaults(), description="Rows that carry the answer alone."
    )
    selection: Selection = Field(default=Selection.defaults(), description="How predictors leave the model.")
    weak_model: WeakModel = Field(
        default=WeakModel.defaults(), description="What happens when the F test is not significant."
    )
    final_checks: FinalChecks = Field(
        default=FinalChecks.defaults(), description="What a failed check of the final model calls for."
    )
    errors: Errors = Field(
        default="classical",
        description="Standard errors: classical, hc0 to hc3, {cluster_by: …} or {autocorrelation_lags: …}.",
    )
    expects: Expects | None = Field(default=None, description="What the analyst expects, for rehearsal.")
    rehearsal: Rehearsal = Field(default=Rehearsal.defaults(), description="How the plan is rehearsed.")
    alternatives: Annotated[
        Mapping[str, Mapping[str, Any]], AfterValidator(frozen), PlainSerializer(dict)
    ] = Field(
        default=frozen({}),
        description="Named changes of this plan; the run is repeated with each: does the answer hold?",
    )
    refresh: Refresh = Field(
        default=Refresh.defaults(), description="What counts as an answer that still holds on new data."
    )
    amendments: tuple[Amendment, ...] = Field(
        default=(), description="Changes made after the plan was sealed."
    )

    _origin: PlanOrigin | None = PrivateAttr(default=None)

    @property
    def origin(self) -> PlanOrigin | None:
        """Where the plan was read; None for one made in memory."""
        return self._origin

    def with_origin(self, origin: PlanOrigin | None) -> Plan:
        """The same plan, said to have been read there."""
        copy = self.model_copy()
        copy._origin = origin
        return copy

    def predictor(self, column: str) -> Predictor:
        """The predictor of that name; KeyError when there is none."""
        for predictor in self.predictors:
            if predictor.column == column:
                return predictor
        raise KeyError(column)

    def __eq__(self, other: object) -> bool:
        """Plans are equal when they say the same, wherever they were read."""
        return isinstance(other, Plan) and self.__dict__ == other.__dict__

    def __hash__(self) -> int:
        return hash(tuple(self.__dict__.values()))
