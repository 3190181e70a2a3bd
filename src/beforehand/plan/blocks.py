"""The blocks that hold the rules: one for each step, and those about errors, rehearsal and refresh."""

from __future__ import annotations

import datetime
from collections.abc import Mapping
from typing import Annotated, ClassVar, Literal

from pydantic import AfterValidator, Field, PlainSerializer, Tag

from beforehand.plan.block import WORD_TAG, Block, by_shape, frozen, tag_of
from beforehand.plan.limits import Limit
from beforehand.plan.numbers import ANY_NUMBER, LEVEL_OF_TEST, POSITIVE, SHARE, Real, Whole
from beforehand.plan.scalars import NAME, TEXT, TRUTH, WORD, Cell, Day, Interval, Pair, Rung, Slope, Word

# A change of R² or a correlation at 0 would always be reached.
_SHARE_ABOVE_ZERO = Real(above=0.0, at_most=1.0, percent=True)
_NOT_NEGATIVE = Real(at_least=0.0)

Weaker = Literal["remove_weaker", "keep_both"]
ReportOrStop = Literal["report", "stop"]


class FillValue(Block):
    """A value that stands for every missing cell of a predictor."""

    value: Annotated[float | str, Cell()] = Field(description="A number, or a level of a category.")


Fill = Annotated[
    Annotated[
        Annotated[Literal["mean", "median", "most_common", "regression"], Word("{value: 0}")], Tag(WORD_TAG)
    ]
    | Annotated[FillValue, Tag(tag_of(FillValue))],
    by_shape(WORD_TAG, (FillValue, "value")),
]


class MissingData(Block):
    """What happens to missing cells. Outcome-blind, but for rows whose outcome is missing."""

    remove_predictor_above: Annotated[float, SHARE] = Field(
        default=0.40, description="A predictor with a larger share missing leaves, unless kept."
    )
    fill: Annotated[Mapping[str, Fill], AfterValidator(frozen), PlainSerializer(dict)] = Field(
        default=frozen({}),
        description="Predictor to mean, median, most_common, regression or {value: …}; in plan order.",
    )
    otherwise: Annotated[Literal["remove_rows"], WORD] = Field(
        default="remove_rows", description="What happens to rows that are still incomplete."
    )
    out_of_range: Annotated[Literal["fault", "missing"], WORD] = Field(
        default="fault", description="Whether a value outside its declared range is a fault or missing."
    )


class CurvatureCheck(Block):
    """For each numeric predictor: the added square of its centred values."""

    alpha: Annotated[float, LEVEL_OF_TEST] = Field(default=0.01, description="Level of the check.")


class SpreadCheck(Block):
    """Whether the residuals spread evenly."""

    test: Annotated[Literal["breusch_pagan", "white"], WORD] = Field(
        default="breusch_pagan", description="The test; Breusch-Pagan in Koenker's studentized form."
    )
    alpha: Annotated[float, LEVEL_OF_TEST] = Field(default=0.01, description="Level of the check.")


class NormalityCheck(Block):
    """Whether the residuals look normal."""

    test: Annotated[Literal["jarque_bera", "shapiro_wilk"], WORD] = Field(
        default="jarque_bera", description="The test."
    )
    alpha: Annotated[float, LEVEL_OF_TEST] = Field(default=0.01, description="Level of the check.")


class IndependenceCheck(Block):
    """Whether residuals that follow each other hang together."""

    test: Annotated[Literal["breusch_godfrey", "durbin_watson"], WORD] = Field(
        default="breusch_godfrey", description="A test with a p value, or a statistic between two bounds."
    )
    lags: Annotated[int, Whole(at_least=1, at_most=1000)] = Field(
        default=1, description="Lags of the Breusch-Godfrey test."
    )
    alpha: Annotated[float, LEVEL_OF_TEST] = Field(
        default=0.01, description="Level of the Breusch-Godfrey test."
    )
    in_order_of: Annotated[str, NAME] | None = Field(
        default=None, description="Column that orders the rows; without one the check is not made."
    )
    between: Annotated[tuple[float, float], Interval(open_ended=False)] | None = Field(
        default=None, description="Bounds that the Durbin-Watson statistic must keep, [low, high]."
    )


_Skip = Annotated[Annotated[Literal["skip"], Word("a mapping, such as {alpha: 0.01}")], Tag(WORD_TAG)]


class Assumptions(Block):
    """Which checks are made, and at which level. Each may be the word skip."""

    curvature: Annotated[
        Annotated[CurvatureCheck, Tag(tag_of(CurvatureCheck))] | _Skip,
        by_shape(WORD_TAG, (CurvatureCheck, "alpha")),
    ] = Field(default=CurvatureCheck.defaults(), description="Is the relation straight? Per predictor.")
    equal_spread: Annotated[
        Annotated[SpreadCheck, Tag(tag_of(SpreadCheck))] | _Skip,
        by_shape(WORD_TAG, (SpreadCheck, "alpha")),
    ] = Field(default=SpreadCheck.defaults(), description="Is the spread of the residuals even?")
    normal_residuals: Annotated[
        Annotated[NormalityCheck, Tag(tag_of(NormalityCheck))] | _Skip,
        by_shape(WORD_TAG, (NormalityCheck, "alpha")),
    ] = Field(default=NormalityCheck.defaults(), description="Are the residuals normal?")
    independence: Annotated[
        Annotated[IndependenceCheck, Tag(tag_of(IndependenceCheck))] | _Skip,
        by_shape(WORD_TAG, (IndependenceCheck, "alpha")),
    ] = Field(default=IndependenceCheck.defaults(), description="Are the residuals independent in order?")


class Transforms(Block):
    """When a predictor climbs the ladder, and which rungs it tries."""

    unordered: ClassVar[tuple[str, ...]] = ("when",)

    when: tuple[Annotated[Literal["curvature", "spread"], WORD], ...] = Field(
        default=("curvature",), description="Failed checks that call the ladder."
    )
    try_: tuple[Annotated[Rung, WORD], ...] = Field(
        default=("square", "cube", "square_root"),
        alias="try",
        description="Rungs in the order in which they are tried; the first that passes is adopted.",
    )
    if_none_works: Annotated[Literal["remove_predictor", "keep_as_is"], WORD] = Field(
        default="keep_as_is", description="What happens to a predictor that no rung helps."
    )


class ExamineWhen(Block):
    """What calls a pair of predictors up for examination."""

    vif_above: Annotated[float, Real(at_least=1.0)] | None = Field(
        default=5.0, description="Variance inflation factor at or over this; null examines none for it."
    )
    correlation_above: Annotated[float, _SHARE_ABOVE_ZERO] | None = Field(
        default=0.8, description="Absolute correlation at or over this; null examines none for it."
    )


class LargeChange(Block):
    """What counts as a large change when the weaker of two is left out."""

    r_squared: Annotated[float, SHARE] = Field(default=0.02, description="Change of R².")
    coefficient: Annotated[float, _NOT_NEGATIVE] = Field(
        default=1.0, description="Change of any other coefficient, in its standard errors."
    )


class Collinearity(Block):
    """Which predictors that say the same are examined, and which of them leaves."""

    examine_when: ExamineWhen = Field(default=ExamineWhen.defaults(), description="What calls a pair up.")
    when_one_significant: Annotated[Literal["remove_other", "leave_to_selection"], WORD] = Field(
        default="remove_other", description="What happens when one of the two is significant."
    )
    when_both_significant: Annotated[Literal["compare", "keep_both", "remove_weaker"], WORD] = Field(
        default="compare", description="What happens when both are significant."
    )
    large_change: LargeChange = Field(
        default=LargeChange.defaults(), description="What counts as a large change in a comparison."
    )
    if_large: Annotated[Weaker, WORD] = Field(
        default="remove_weaker", description="What a large change calls for."
    )
    if_small: Annotated[Weaker, WORD] = Field(
        default="keep_both", description="What a small change calls for."
    )


class FlagWhen(Block):
    """Measures that flag a row, each with its limit; null does not flag."""

    cooks_distance: Limit | None = Field(default=Limit.of("4/n"), description="Cook's distance above this.")
    leverage: Limit | None = Field(default=Limit.of("3*p/n"), description="Leverage above this.")
    studentized_residual: Limit | None = Field(
        default=Limit.of(3), description="Absolute externally studentized residual above this."
    )
    dffits: Limit | None = Field(default=None, description="Absolute DFFITS above this.")
    dfbetas: Limit | None = Field(default=None, description="Largest absolute DFBETAS above this.")
    covariance_ratio: Limit | None = Field(
        default=None, description="Distance of the covariance ratio from 1 above this."
    )


class RemoveWhen(Block):
    """Changes of the answer, with the row against without it, that remove a flagged row."""

    coefficient: Annotated[float, POSITIVE] | None = Field(
        default=1.0, description="Change of any coefficient but the intercept, in standard errors."
    )
    r_squared: Annotated[float, _SHARE_ABOVE_ZERO] | None = Field(
        default=None, description="Absolute change of R²."
    )
    significance_changes: Annotated[bool, TRUTH] = Field(
        default=False, description="Whether a predictor that gains or loses significance counts."
    )
    sign_changes: Annotated[bool, TRUTH] = Field(
        default=False, description="Whether a changed sign of a significant predictor counts."
    )


class Influence(Block):
    """Which rows are flagged, and which of them leave."""

    flag_when: FlagWhen = Field(default=FlagWhen.defaults(), description="Limits of the measures.")
    remove_when: RemoveWhen = Field(default=RemoveWhen.defaults(), description="Changes that remove a row.")
    at_most: Annotated[float, SHARE] = Field(
        default=0.05, description="Largest share of the rows that may leave, rounded up."
    )
    record_at_most: Annotated[int, Whole(at_least=0, at_most=1_000_000)] = Field(
        default=50, description="Flagged rows that stay and are recorded one by one."
    )


class Selection(Block):
    """How predictors that add nothing leave."""

    method: Annotated[Literal["backward", "none", "backward_aic", "backward_bic", "best_subset"], WORD] = (
        Field(default="backward", description="How predictors are chosen; none keeps the full model.")
    )


class WeakModel(Block):
    """What happens when the model as a whole is not significant."""

    with_theory: Annotated[Literal["report", "try_selection"], WORD] = Field(
        default="report", description="Where the plan has keep rules."
    )
    without_theory: Annotated[Literal["mean_only"], WORD] = Field(
        default="mean_only", description="Where it has none: the mean is the answer."
    )
    near: Annotated[float, LEVEL_OF_TEST] = Field(
        default=0.20, description="Predictors with p up to this are near misses."
    )


class FinalChecks(Block):
    """What a failed check of the final model calls for."""

    if_spread_unequal: Annotated[Literal["robust_errors", "report", "stop"], WORD] = Field(
        default="robust_errors", description="When the spread is not even; robust errors are HC3."
    )
    if_not_normal: Annotated[ReportOrStop, WORD] = Field(
        default="report", description="When the residuals are not normal."
    )
    if_curved: Annotated[ReportOrStop, WORD] = Field(
        default="report", description="When a relation is still curved."
    )
    if_dependent: Annotated[ReportOrStop, WORD] = Field(
        default="report", description="When the residuals hang together in order."
    )


class ClusterBy(Block):
    """Standard errors that allow rows of one cluster to hang together."""

    cluster_by: Annotated[str, NAME] = Field(description="Column that names the cluster of a row.")


class AutocorrelationLags(Block):
    """Standard errors that allow neighbours in order to hang together (Newey-West)."""

    autocorrelation_lags: Annotated[int, Whole(at_least=1, at_most=10_000)] = Field(
        description="Lags, in the order of assumptions.independence.in_order_of."
    )


Errors = Annotated[
    Annotated[
        Annotated[
            Literal["classical", "hc0", "hc1", "hc2", "hc3"],
            Word("{cluster_by: column} or {autocorrelation_lags: 7}"),
        ],
        Tag(WORD_TAG),
    ]
    | Annotated[ClusterBy, Tag(tag_of(ClusterBy))]
    | Annotated[AutocorrelationLags, Tag(tag_of(AutocorrelationLags))],
    by_shape(WORD_TAG, (ClusterBy, "cluster_by"), (AutocorrelationLags, "autocorrelation_lags")),
]


class ExpectedPredictor(Block):
    """What the analyst expects a predictor to look like, where no table is at hand."""

    mean: Annotated[float, ANY_NUMBER] | None = Field(default=None, description="Mean of a number.")
    sd: Annotated[float, POSITIVE] | None = Field(default=None, description="Standard deviation of a number.")
    shares: Annotated[
        Mapping[str, Annotated[float, SHARE]], AfterValidator(frozen), PlainSerializer(dict)
    ] = Field(default=frozen({}), description="Share of the rows at each level of a category.")


class ExpectedCorrelation(Block):
    """How closely two predictors are expected to go together, where no table is at hand."""

    between: Annotated[tuple[str, str], Pair()] = Field(description="Two predictors that are numbers.")
    r: Annotated[float, Real(above=-1.0, below=1.0)] = Field(description="Their correlation.")


class Expects(Block):
    """What the analyst expects, for rehearsal."""

    unordered: ClassVar[tuple[str, ...]] = ("correlations",)

    residual_sd: Annotated[float, POSITIVE] = Field(
        description="Standard deviation of the outcome about its expectation, in outcome units."
    )
    slopes: Annotated[
        Mapping[str, Annotated[float | Mapping[str, float], Slope()]],
        AfterValidator(frozen),
        PlainSerializer(dict),
    ] = Field(
        default=frozen({}),
        description=(
            "Predictor to outcome units per unit, or of a category each level to its difference from the "
            "baseline; 0 for those not named."
        ),
    )
    predictors: (
        Annotated[Mapping[str, ExpectedPredictor], AfterValidator(frozen), PlainSerializer(dict)] | None
    ) = Field(default=None, description="Predictor to its expected mean and sd, or shares of its levels.")
    correlations: tuple[ExpectedCorrelation, ...] = Field(
        default=(), description="Expected correlations of predictors; 0 for pairs not named."
    )


Scenario = Literal["scrambled", "noise", "expected", "resample", "hold_out"]


class Rehearsal(Block):
    """How often the whole plan is tried on made-up outcomes."""

    unordered: ClassVar[tuple[str, ...]] = ("scenarios",)

    replicates: Annotated[int, Whole(at_least=1, at_most=10_000_000)] = Field(
        default=2000, description="Runs of the plan in each scenario."
    )
    seed: Annotated[int, Whole(at_least=0, at_most=2**63 - 1)] = Field(
        default=20261201, description="Seed of the random numbers."
    )
    scenarios: tuple[Annotated[Scenario, WORD], ...] = Field(
        default=("noise", "expected", "resample"),
        description="Which worlds are tried; expected only where the plan says what it expects.",
    )
    folds: Annotated[int, Whole(at_least=2, at_most=1000)] = Field(
        default=10, description="Parts of the rows that hold_out leaves out one at a time."
    )
    leave_out: Annotated[str, NAME] | None = Field(
        default=None,
        description="Column whose groups hold_out leaves out instead; errors.cluster_by where there is one.",
    )


class Refresh(Block):
    """What counts as an answer that still holds on new data."""

    coefficient: Annotated[float, _NOT_NEGATIVE] = Field(
        default=2.0, description="A coefficient moves by at most so many of its old standard errors."
    )
    r_squared: Annotated[float, SHARE] = Field(default=0.05, description="R² moves by at most this.")
    rulings: Annotated[Literal["same", "any"], WORD] = Field(
        default="same", description="Whether every predictor must come to the same verdict."
    )
    learned: Annotated[Literal["replay", "anew"], WORD] = Field(
        default="anew", description="Whether fills and exponents are learned anew or taken from the old lock."
    )


class Amendment(Block):
    """A change of the plan after it was sealed."""

    date: Annotated[datetime.date, Day()] = Field(description="Day of the change, such as 2026-12-01.")
    why: Annotated[str, TEXT] = Field(description="What made the change necessary.")
    kind: Annotated[Literal["unforeseen", "mistake", "gap", "assumption_failed"], WORD] = Field(
        description="What kind of reason it is."
    )
    seen: Annotated[Literal["nothing", "predictors", "everything"], WORD] = Field(
        description="What of the data had been seen by then."
    )
    expected_effect: Annotated[str, TEXT] = Field(description="What the change is expected to do.")
