"""The record of a rehearsal, as it stands in a ``NAME.rehearsal.yaml``.

The order of fields is the order in the file. Scenarios that were not asked for are left out; figures
that rest on nothing, such as the exaggeration of an effect that was never found, are null.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Annotated, ClassVar, Literal

from pydantic import Field

from beforehand.lock.models import Environment
from beforehand.lock.record import Count, Digest, Figure, Name, Record, RulingId
from beforehand.rehearsing.figures import Estimate

REHEARSAL_VERSION = 1

Estimates = Mapping[Name, Estimate]
Ends = tuple[Figure, Figure]


class Statuses(Record):
    """How the replicates ended, each way with its share."""

    in_blocks: ClassVar[bool] = True

    adopted: Estimate = Field(description="An answer was adopted.")
    mean_only: Estimate = Field(description="The answer is the mean.")
    inconclusive: Estimate = Field(description="The model is weak and stands as such.")
    stopped: Estimate = Field(description="A rule of the plan stopped the run.")
    no_fit: Estimate = Field(description="No run could be made, for too few rows or an outcome of one value.")


class Spread(Record):
    """How a figure of the final model is spread over replicates that had a fit."""

    in_blocks: ClassVar[bool] = True

    mean: Estimate = Field(description="Mean over replicates.")
    q05: Estimate = Field(description="One replicate in twenty is below it.")
    q50: Estimate = Field(description="The middle one.")
    q95: Estimate = Field(description="One replicate in twenty is above it.")


class PSpread(Record):
    """How the p of an F test is spread over replicates."""

    in_blocks: ClassVar[bool] = True

    q05: Estimate = Field(description="One replicate in twenty is below it.")
    q50: Estimate = Field(description="The middle one.")
    q95: Estimate = Field(description="One replicate in twenty is above it.")
    at_or_below_alpha: Estimate = Field(description="Share of replicates at or below the plan's alpha.")


class HowMany(Record):
    """How many predictors an answer has."""

    in_blocks: ClassVar[bool] = True

    mean: Estimate = Field(description="Mean number over replicates.")


class Calibrated(Record):
    """The real answer held against a world without effects."""

    in_blocks: ClassVar[bool] = True

    r_squared: Figure = Field(description="R² of the real answer.")
    p_of_r_squared: Estimate = Field(description="Share of noise replicates with at least this R².")
    model_p: Figure | None = Field(description="p of the real answer's F test.")
    p_of_model_p: Estimate | None = Field(description="Share of noise replicates with at most this p.")
    note: str = Field(description="How the shares are counted.")


class NoiseFigures(Record):
    """What the plan does where no predictor has an effect."""

    in_blocks: ClassVar[bool] = True
    left_out: ClassVar[frozenset[str]] = frozenset({"calibrated"})

    any_adopted: Estimate = Field(
        description="Chance that at least one predictor is adopted that is not held."
    )
    adopted: Estimates = Field(description="Chance of each predictor that is not held.")
    r_squared: Spread | None = Field(description="R² of the answer.")
    adjusted_r_squared: Spread | None = Field(description="Adjusted R² of the answer.")
    model_p: PSpread = Field(
        description="p of the answer's F test; 1 where the answer is the mean or there is none."
    )
    full_p: PSpread | None = Field(description="p of the F test of the model with which selection began.")
    predictors_adopted: HowMany = Field(description="How many predictors are adopted that are not held.")
    statuses: Statuses = Field(description="How the replicates ended.")
    calibrated: Calibrated | None = Field(
        default=None, description="The real answer beside this world; left out where there is none."
    )
    held: tuple[Name, ...] = Field(description="Predictors that a rule keeps always; they are not counted.")


class RestsOn(Record):
    """How many replicates a conditional figure rests on."""

    exaggeration: Count = Field(description="Replicates in which it is significant and as it was read.")
    coverage: Count = Field(description="Replicates in whose answer it stands as it was read.")


class ExpectedColumn(Record):
    """How well one level of a category that has an effect is estimated."""

    in_blocks: ClassVar[bool] = True

    true: Figure = Field(description="Effect that was put in.")
    exaggeration: Estimate | None = Field(description="Mean of |estimate / true| where it is significant.")
    wrong_sign: Estimate | None = Field(description="Share of those that have the wrong sign.")
    coverage: Estimate | None = Field(description="Share of intervals in answers that hold the truth.")
    rests_on: RestsOn = Field(description="Replicates behind these figures.")


class ExpectedPredictorFigures(Record):
    """How well an effect that was put in is found."""

    in_blocks: ClassVar[bool] = True
    left_out: ClassVar[frozenset[str]] = frozenset({"rests_on", "columns"})

    true: Figure | None = Field(description="Slope that was put in; null for a category, see columns.")
    power: Estimate = Field(description="Chance that it is significant in an adopted answer.")
    adopted: Estimate = Field(description="Chance that it is adopted.")
    exaggeration: Estimate | None = Field(
        description="Mean of |estimate / true| where it is significant and as it was read."
    )
    wrong_sign: Estimate | None = Field(description="Share of those that have the wrong sign.")
    coverage: Estimate | None = Field(
        description="Share of its intervals in answers, as it was read, that hold the truth."
    )
    transformed: Estimate = Field(description="Chance that it is adopted under a rung of the ladder.")
    rests_on: RestsOn | None = Field(default=None, description="Replicates behind the conditional figures.")
    columns: Mapping[Name, ExpectedColumn] | None = Field(
        default=None, description="A category's levels that have an effect; left out for a number."
    )


class AtRows(Record):
    """The main figures at one number of rows."""

    in_blocks: ClassVar[bool] = True

    rows: Count = Field(description="Rows of each table.")
    any_without_effect_adopted: Estimate | None = Field(
        description="Chance that at least one predictor without an effect is adopted."
    )
    power: Estimates = Field(description="Chance to find each effect.")


class ExpectedFigures(Record):
    """What the plan does where the expected effects hold and all others are nothing."""

    in_blocks: ClassVar[bool] = True
    left_out: ClassVar[frozenset[str]] = frozenset({"rows_needed"})

    any_without_effect_adopted: Estimate | None = Field(
        description="Chance that at least one predictor without an effect is adopted; null without such."
    )
    rows: Count = Field(description="Rows of each table behind all but by_rows.")
    predictors: Mapping[Name, ExpectedPredictorFigures] = Field(description="Predictors with an effect.")
    without_effect: Estimates = Field(description="Chance that each predictor without an effect is adopted.")
    statuses: Statuses = Field(description="How the replicates ended.")
    r_squared: Spread | None = Field(description="R² of the answer.")
    by_rows: tuple[AtRows, ...] = Field(description="The same at each number of rows.")
    rows_needed: Mapping[Name, Count | None] | None = Field(
        default=None,
        description="Fewest rows of the grid with power 0.80; null where none has; left out without a grid.",
    )
    held: tuple[Name, ...] = Field(description="Predictors that a rule keeps always; they are not counted.")


class PairShare(Record):
    """How often two predictors are adopted together."""

    predictors: tuple[Name, Name] = Field(description="The two.")
    both: Estimate = Field(description="Share of replicates that adopt both.")
    if_unrelated: Figure = Field(description="Product of their own shares.")


class ModelShare(Record):
    """How often one set of predictors is the answer."""

    predictors: tuple[Name, ...] = Field(description="The set, in plan order; empty where none is adopted.")
    share: Estimate = Field(description="Share of replicates that adopt just these.")


class HalfSamples(Record):
    """The plan on halves of the rows, drawn without replacement."""

    in_blocks: ClassVar[bool] = True

    rows: Count = Field(description="Rows of each half.")
    inclusion: Estimates = Field(description="Share of halves on which each predictor is adopted.")
    pairs: tuple[PairShare, ...] = Field(description="Pairs of predictors, the most frequent first.")
    models: tuple[ModelShare, ...] = Field(description="Most frequent answers, at most ten.")
    different_models: Count = Field(description="How many different sets of predictors are adopted.")
    sign_stability: Mapping[Name, Estimate | None] = Field(
        description="Share of the adopted coefficients that have the more frequent sign, by column."
    )
    statuses: Statuses = Field(description="How the replicates ended.")


class Optimism(Record):
    """R² of the answer, and how much of it another sample would not show (Harrell, Lee & Mark 1996)."""

    in_blocks: ClassVar[bool] = True

    apparent: Figure | None = Field(description="R² of the real answer on its own rows.")
    optimism: Estimate | None = Field(
        description="Mean of R² on the replicate's rows less R² of that model on the original rows."
    )
    corrected: Estimate | None = Field(description="Apparent R² less optimism.")


class Interval(Record):
    """Intervals of one coefficient that include selection; a column that is not selected counts as 0."""

    percentile: Ends | None = Field(description="Quantiles of the estimates over replicates.")
    percentile_mc_error: Ends | None = Field(description="Monte Carlo errors of these ends.")
    bias_corrected: Ends | None = Field(description="Efron's (1981) bias-corrected percentiles.")
    bias_corrected_mc_error: Ends | None = Field(description="Monte Carlo errors of these ends.")


class RulingShare(Record):
    """How often a ruling of the real run falls the same way."""

    ruling: RulingId = Field(description="Its number in the lock.")
    subject: str = Field(description="Of whom it is.")
    ground: str = Field(description="What it rests on.")
    same: Estimate = Field(description="Share of replicates in which it falls as it fell.")


class Bootstrap(Record):
    """The plan on as many rows drawn with replacement."""

    in_blocks: ClassVar[bool] = True

    inclusion: Estimates = Field(description="Share of replicates that adopt each predictor.")
    relative_conditional_bias: Mapping[Name, Estimate | None] = Field(
        description="Mean estimate where selected over that of the full model, less 1; by column."
    )
    rmsd_ratio: Mapping[Name, Estimate | None] = Field(
        description="Root mean squared distance to the full model's estimate, in its standard errors."
    )
    r_squared: Optimism = Field(description="R² and its optimism.")
    calibration_slope: Estimate | None = Field(
        description="Slope of the outcome on predictions of the replicates' models; 1 is ideal."
    )
    intervals: Mapping[Name, Interval] = Field(description="Intervals at 1 - alpha, by column.")
    rulings: tuple[RulingShare, ...] = Field(description="Rulings of the real run, in its order.")
    statuses: Statuses = Field(description="How the replicates ended.")


class ResampleFigures(Record):
    """The whole plan redone on other samples from the same rows."""

    in_blocks: ClassVar[bool] = True

    half_samples: HalfSamples = Field(description="Halves of the rows: stability of the choices.")
    bootstrap: Bootstrap = Field(description="Rows drawn with replacement: bias and optimism.")


class HoldOutFigures(Record):
    """Errors of prediction on rows that the plan had not seen."""

    in_blocks: ClassVar[bool] = True
    left_out: ClassVar[frozenset[str]] = frozenset({"groups"})

    folds: Count = Field(description="Parts that are left out one at a time.")
    repeats: Count = Field(description="How often the parts were drawn anew.")
    groups: tuple[str, ...] | None = Field(
        default=None, description="Groups that are left out one at a time; left out where parts are drawn."
    )
    rmse: Estimate | None = Field(description="Typical error of the plan's answer, in units of the outcome.")
    rmse_mean_model: Estimate | None = Field(description="Typical error of the mean of the other rows.")
    r_squared: Estimate | None = Field(description="1 less the ratio of the sums of squared errors.")
    predicted: Count = Field(description="Predictions that were made, all repeats together.")
    not_predicted: Count = Field(description="Rows that could not be predicted, all repeats together.")
    no_fit: Count = Field(description="Parts without which no run could be made, all repeats together.")


class ScrambledRun(Record):
    """The blinded run on a shuffled outcome."""

    lock: str = Field(description="Name of its lockfile.")
    status: str = Field(description="How it ended.")
    seed: Count = Field(description="Seed of the shuffle.")


class Scenarios(Record):
    """The worlds that were rehearsed; those that were not are left out."""

    in_blocks: ClassVar[bool] = True
    left_out: ClassVar[frozenset[str]] = frozenset({"scrambled", "noise", "expected", "resample", "hold_out"})

    scrambled: ScrambledRun | None = Field(default=None, description="A blinded dry run.")
    noise: NoiseFigures | None = Field(default=None, description="No effect at all.")
    expected: ExpectedFigures | None = Field(default=None, description="The expected effects.")
    resample: ResampleFigures | None = Field(default=None, description="Other samples from the same rows.")
    hold_out: HoldOutFigures | None = Field(default=None, description="Rows that the plan had not seen.")


class RehearsedPlan(Record):
    """The plan that was rehearsed."""

    in_blocks: ClassVar[bool] = True

    file: str = Field(description="Name of the plan's file.")
    decisions: Digest = Field(description="Digest of all in it that can change a result.")
    whole: Digest = Field(description="Digest of every word in it.")


class RehearsedData(Record):
    """The table on which it was rehearsed."""

    in_blocks: ClassVar[bool] = True

    file: str = Field(description="File as the plan names it.")
    fingerprint: Digest = Field(description="Digest of the columns in use, as typed, in canonical order.")
    rows: Count = Field(description="Rows read.")


class RehearsalRecord(Record):
    """The whole record of one rehearsal.

    A record made in memory carries the digest ``""``; writing fills it in.
    """

    sentences: ClassVar[frozenset[str]] = frozenset({"not_rehearsed"})

    rehearsal: Literal[1] = Field(description="Version of the record's language.")
    plan: RehearsedPlan = Field(description="The plan that was rehearsed.")
    data: RehearsedData | None = Field(description="The table; null where predictors were drawn.")
    lock: Digest | None = Field(description="Digest of the real run's lock; null where there is none.")
    seed: Count = Field(description="Seed of the random numbers.")
    replicates: Count = Field(description="Replicates of each scenario that were asked for.")
    scenarios: Scenarios = Field(description="What the plan came to in each world.")
    # The name in the file is taken by what every record knows of its own fields.
    not_rehearsed: tuple[str, ...] = Field(
        alias="left_out", description="Which scenarios were not rehearsed and why, one sentence each."
    )
    environment: Environment = Field(description="What it was made with; outside the digest.")
    digest: Annotated[str, Field(pattern=r"^(sha256:[0-9a-f]{64})?$")] = Field(
        default="", description="Digest of all lines above the environment."
    )
