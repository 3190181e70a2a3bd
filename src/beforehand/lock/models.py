"""The lock: the whole record of one run, as it stands in a ``NAME.lock.yaml``.

The order of fields is the order in the file. What a run did not come to is null or an empty
list, never left out, so that two locks can be read side by side.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Annotated, ClassVar, Literal

from pydantic import Field

from beforehand.lock.answer import Answer
from beforehand.lock.checks import Checks
from beforehand.lock.pictures import PictureData
from beforehand.lock.prediction import Prediction
from beforehand.lock.record import Count, Digest, Figure, Name, PlainData, Record
from beforehand.lock.trail import FitRecord, LedgerStage, PredictorFate, RowRemoved, RulingRecord

LOCK_VERSION = 1

Status = Literal["adopted", "mean_only", "inconclusive", "stopped"]


class PlanRecord(Record):
    """The plan that was run, whole."""

    file: str = Field(description="Name of the plan's file.")
    title: str = Field(description="Its title.")
    question: str = Field(description="Its question.")
    decisions: Digest = Field(description="Digest of all in it that can change a result.")
    whole: Digest = Field(description="Digest of every word in it.")
    written: PlainData = Field(description="The plan with all defaults written out.")


class SealChange(Record):
    """One change of the plan since it was sealed."""

    clause: str = Field(description="Place in the plan.")
    class_: Literal["looser", "stricter", "different", "wording"] = Field(
        alias="class", description="What the change does to the answer's standard."
    )
    says: str = Field(description="The change in one sentence.")


class SealRecord(Record):
    """Whether the plan was sealed before the run, and what changed since."""

    left_out: ClassVar[frozenset[str]] = frozenset({"seals", "before_first_look"})

    state: Literal["sealed", "unsealed", "amended", "deviates"] = Field(description="State of the seal.")
    seals: Count | None = Field(default=None, description="Seals in the chain; the last is the one in force.")
    before_first_look: bool | None = Field(
        default=None, description="Whether the first seal precedes the first run on this outcome."
    )
    changes: tuple[SealChange, ...] = Field(description="Changes since the first seal.")


class DataRecord(Record):
    """The table that was read."""

    left_out: ClassVar[frozenset[str]] = frozenset({"columns"})

    file: str = Field(description="File as the plan names it.")
    fingerprint: Digest = Field(description="Digest of the columns in use, as typed, in canonical order.")
    rows: Count = Field(description="Rows read.")
    labelled: bool = Field(description="Whether rows have labels of their own.")
    labels: Literal["shown", "hashed"] = Field(description="How labels stand in this lock.")
    columns: Mapping[Name, str] | None = Field(
        default=None, description="Names of the file's columns by those of the plan, where they differ."
    )


class LearnedRecord(Record):
    """What a run took from an earlier one instead of learning it anew."""

    fills: Mapping[Name, Figure | str] = Field(description="Values of missing cells, by predictor.")
    exponents: Mapping[Name, Figure] = Field(description="Box-Cox exponents, by column.")


class Alternative(Record):
    """The same run with the changes that the plan declares, and whether the answer holds."""

    changes: PlainData = Field(description="What the plan changes.")
    status: Status = Field(description="How the run ended.")
    answer: Answer | None = Field(description="What it came to; null when it stopped before any fit.")
    ledger: tuple[LedgerStage, ...] = Field(description="Rows at each stage.")
    rows_removed: tuple[RowRemoved, ...] = Field(description="Rows that left.")
    predictors: Mapping[Name, PredictorFate] = Field(description="How each predictor ended.")
    rulings: tuple[RulingRecord, ...] = Field(description="Every ruling, in order.")
    fits: tuple[FitRecord, ...] = Field(description="Every fit, in the order first asked for.")
    checks: Checks = Field(description="Everything looked at beside the fits.")
    holds: bool = Field(description="Whether the answer holds by the plan's own tolerances.")
    differences: tuple[str, ...] = Field(description="What differs from the main answer, one sentence each.")


class Environment(Record):
    """What the run was made with; outside the digest."""

    beforehand: str = Field(description="Version of this program.")
    python: str = Field(description="Version of Python.")
    numpy: str = Field(description="Version of numpy.")
    scipy: str = Field(description="Version of scipy.")
    pandas: str = Field(description="Version of pandas.")
    statsmodels: str = Field(description="Version of statsmodels.")


class Scrambled(Record):
    """The mark of a dry run: its outcome was shuffled, so that nothing in it is a result."""

    seed: Count = Field(description="Seed of the shuffle.")
    says: str = Field(description="What that means, in one sentence.")


class Lock(Record):
    """The whole record of one run.

    A lock made in memory carries the digest ``""``; writing fills it in.
    """

    left_out: ClassVar[frozenset[str]] = frozenset(
        {"scrambled", "learned", "sealed_plan", "sealed_answer", "prediction", "pictures"}
    )

    lock: Literal[1] = Field(description="Version of the lock's language.")
    scrambled: Scrambled | None = Field(
        default=None, description="The mark of a dry run on a shuffled outcome; left out of every other."
    )
    plan: PlanRecord = Field(description="The plan that was run.")
    seal: SealRecord = Field(description="State of its seal.")
    data: DataRecord = Field(description="The table that was read.")
    learned: LearnedRecord | None = Field(
        default=None, description="What was taken from an earlier run instead of being learned anew."
    )
    status: Status = Field(description="How the run ended.")
    answer: Answer | None = Field(description="What it came to; null when it stopped before any fit.")
    sealed_answer: Answer | None = Field(
        default=None, description="What the plan as first sealed comes to, beside the amended one."
    )
    sealed_plan: PlanRecord | None = Field(default=None, description="The plan as first sealed.")
    ledger: tuple[LedgerStage, ...] = Field(description="Rows at each stage.")
    rows_removed: tuple[RowRemoved, ...] = Field(description="Rows that left.")
    predictors: Mapping[Name, PredictorFate] = Field(description="How each predictor ended, in plan order.")
    rulings: tuple[RulingRecord, ...] = Field(description="Every ruling, in order.")
    fits: tuple[FitRecord, ...] = Field(description="Every fit, in the order first asked for.")
    checks: Checks = Field(description="Everything looked at beside the fits.")
    prediction: Prediction | None = Field(
        default=None, description="What a prediction for a new case needs; left out where none can be made."
    )
    alternatives: Mapping[Name, Alternative] = Field(description="Declared alternatives, each a whole run.")
    pictures: PictureData | None = Field(
        default=None, description="What pictures are drawn from; left out of locks of earlier versions."
    )
    environment: Environment = Field(description="What the run was made with; outside the digest.")
    digest: Annotated[str, Field(pattern=r"^(sha256:[0-9a-f]{64})?$")] = Field(
        default="", description="Digest of all lines above the environment."
    )
