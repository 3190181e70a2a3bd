"""The blocks that say what the table holds: rows, columns, outcome, predictors, and what theory keeps."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Annotated, Any, ClassVar, Literal

from pydantic import BeforeValidator, ConfigDict, Field, Tag, model_validator

from beforehand.plan.arithmetic import Expression
from beforehand.plan.block import WORD_TAG, Block, by_shape, tag_of
from beforehand.plan.formula import formula_from
from beforehand.plan.numbers import LEVEL_OF_TEST, POSITIVE, wrong
from beforehand.plan.scalars import (
    CODE,
    LEVEL,
    LINE,
    NAME,
    TEXT,
    WORD,
    Bound,
    Cell,
    Interval,
    Pair,
    Rung,
    Word,
    encoding_from,
)


class Data(Block):
    """The file that holds the table, and how it is written."""

    words: ClassVar[tuple[str, ...]] = ("labels_in_lock",)
    unordered: ClassVar[tuple[str, ...]] = ("missing_codes",)

    file: Annotated[str, LINE] = Field(
        description="The data file, relative to the plan and inside its folder."
    )
    row_label: Annotated[str, NAME] | None = Field(
        default=None, description="Column with a unique label for each row; null numbers the rows."
    )
    missing_codes: tuple[Annotated[str, CODE], ...] = Field(
        default=("", "NA", "-"), description="Cells that read as missing, as they stand in the file."
    )
    labels_in_lock: Annotated[Literal["shown", "hashed"], WORD] = Field(
        default="shown", description="Whether the lockfile shows row labels or keyed hashes of them."
    )
    separator: Annotated[str, CODE] = Field(
        default=",", description='The character between cells of a text file; "\\t" for a tab.'
    )
    decimal: Annotated[Literal[".", ","], WORD] = Field(
        default=".", description="The decimal mark of numbers in the file."
    )
    encoding: Annotated[str, BeforeValidator(encoding_from)] = Field(
        default="utf-8", description="The text encoding of the file."
    )


CONDITIONS = ("is", "is_not", "one_of", "at_least", "at_most", "above", "below")


class Eligibility(Block):
    """One line of what makes a row part of the population: a column and exactly one condition."""

    words: ClassVar[tuple[str, ...]] = ("because",)
    unordered: ClassVar[tuple[str, ...]] = ("one_of",)
    left_out: ClassVar[tuple[str, ...]] = ("is_", *CONDITIONS)
    model_config = ConfigDict(
        json_schema_extra={"oneOf": [{"required": [condition]} for condition in CONDITIONS]}
    )

    column: Annotated[str, NAME] = Field(description="Column of the file that the condition looks at.")
    is_: Annotated[float | str, Cell()] | None = Field(
        default=None, alias="is", description="Rows with this value are eligible."
    )
    is_not: Annotated[float | str, Cell()] | None = Field(
        default=None, description="Rows with any value but this one are eligible."
    )
    one_of: tuple[Annotated[float | str, Cell()], ...] | None = Field(
        default=None, description="Rows with one of these values are eligible.", min_length=1
    )
    at_least: Annotated[float | str, Bound()] | None = Field(
        default=None, description="Rows with this number or date or a larger one are eligible."
    )
    at_most: Annotated[float | str, Bound()] | None = Field(
        default=None, description="Rows with this number or date or a smaller one are eligible."
    )
    above: Annotated[float | str, Bound()] | None = Field(
        default=None, description="Rows with a larger number or a later date are eligible."
    )
    below: Annotated[float | str, Bound()] | None = Field(
        default=None, description="Rows with a smaller number or an earlier date are eligible."
    )
    because: Annotated[str, TEXT] = Field(description="Why rows outside the condition do not count.")

    @model_validator(mode="after")
    def _one_condition(self) -> Eligibility:
        """Several conditions are several lines, each counted in the record."""
        given = [name for name, value in self.conditions().items() if value is not None]
        if len(given) != 1:
            found = "no condition" if not given else f"{len(given)} conditions ({', '.join(given)})"
            raise wrong("condition", f"has {found}; each line has exactly one of {', '.join(CONDITIONS)}")
        return self

    def conditions(self) -> Mapping[str, float | str | tuple[float | str, ...] | None]:
        """Every condition under its name in the file; all but one are None."""
        return {
            "is": self.is_,
            "is_not": self.is_not,
            "one_of": self.one_of,
            "at_least": self.at_least,
            "at_most": self.at_most,
            "above": self.above,
            "below": self.below,
        }

    @property
    def condition(self) -> tuple[str, float | str | tuple[float | str, ...]]:
        """The one condition: its name in the file, and its value."""
        return next((name, value) for name, value in self.conditions().items() if value is not None)


class Derived(Block):
    """A new column, computed from others before anything else."""

    words: ClassVar[tuple[str, ...]] = ("unit", "because")

    column: Annotated[str, NAME] = Field(description="Name of the new column.")
    from_: Annotated[str, BeforeValidator(formula_from)] = Field(
        alias="from",
        description=(
            "Numbers, columns, + - * / ^, brackets, log sqrt abs min max and comparisons (1 or 0). "
            "A name with blanks or signs stands in 'single quotes'."
        ),
    )
    unit: Annotated[str, TEXT] | None = Field(default=None, description="Unit of the new column.")
    because: Annotated[str, TEXT] | None = Field(default=None, description="Why the column is made.")

    @property
    def formula(self) -> Expression:
        """The formula as a tree, for ``beforehand.plan.evaluate``."""
        from beforehand.plan.formula import parse_formula

        return parse_formula(self.from_)


class Outcome(Block):
    """What is explained or predicted: one numeric column."""

    words: ClassVar[tuple[str, ...]] = ("unit",)

    column: Annotated[str, NAME] = Field(description="Column of the outcome.")
    unit: Annotated[str, TEXT] | None = Field(default=None, description="Unit of the outcome.")
    smallest_effect_that_matters: Annotated[float, POSITIVE] | None = Field(
        default=None,
        description="For one SD of a predictor, in outcome units; for rehearsal and write-up.",
    )
    range: Annotated[tuple[float | None, float | None], Interval(open_ended=True)] | None = Field(
        default=None, description="Possible values, [low, high]; null leaves an end open."
    )
    transforms: tuple[Annotated[Rung, WORD], ...] = Field(
        default=(), description="Ladder for the outcome, tried in order; [] never transforms it."
    )


class Predictor(Block):
    """One candidate predictor. Order matters: ties go to the earlier one."""

    words: ClassVar[tuple[str, ...]] = ("unit", "because")
    left_out: ClassVar[tuple[str, ...]] = ("levels", "baseline")

    column: Annotated[str, NAME] = Field(description="Column of the file, or a derived one.")
    unit: Annotated[str, TEXT] | None = Field(default=None, description="Unit of a numeric predictor.")
    kind: Annotated[Literal["number", "category"], WORD] = Field(
        default="number", description="Whether the column holds numbers or named levels."
    )
    range: Annotated[tuple[float | None, float | None], Interval(open_ended=True)] | None = Field(
        default=None, description="Possible values, [low, high]; null leaves an end open."
    )
    role: Annotated[Literal["focal", "adjustment", "candidate"], WORD] = Field(
        default="candidate",
        description="focal: the question is about it; adjustment: held constant; candidate: may go with it.",
    )
    levels: tuple[Annotated[str, LEVEL], ...] = Field(
        default=(), description="Levels of a category, as they stand in the file."
    )
    baseline: Annotated[str, LEVEL] | None = Field(
        default=None, description="Level that the others are compared with; the first one unless given."
    )
    because: Annotated[str, TEXT] | None = Field(default=None, description="Why it is among the predictors.")

    @model_validator(mode="before")
    @classmethod
    def _first_level_is_baseline(cls, written: Any) -> Any:
        """Write the default baseline out, so that plan and record name it."""
        if not isinstance(written, Mapping) or written.get("kind") != "category":
            return written
        levels = written.get("levels")
        if written.get("baseline") is None and isinstance(levels, tuple) and levels:
            return {**written, "baseline": levels[0]}
        return written


class UnlessP(Block):
    """A bound up to which the rule holds."""

    unless_p_above: Annotated[float, LEVEL_OF_TEST] = Field(
        description="The predictor is kept while its p is at or below this."
    )


class KeepPredictor(Block):
    """A predictor, or a product, that no step may remove."""

    words: ClassVar[tuple[str, ...]] = ("because", "source")

    predictor: Annotated[str | tuple[str, str], Pair(or_one=True)] = Field(
        description="A predictor, or the two predictors of a product."
    )
    rule: Annotated[
        Annotated[Annotated[Literal["always"], Word("{unless_p_above: 0.20}")], Tag(WORD_TAG)]
        | Annotated[UnlessP, Tag(tag_of(UnlessP))],
        by_shape(WORD_TAG, (UnlessP, "unless_p_above")),
    ] = Field(description="always, or {unless_p_above: 0.20}.")
    because: Annotated[str, TEXT] = Field(description="The theory behind it.")
    source: Annotated[str, TEXT] | None = Field(default=None, description="Where the theory is written.")
    expected_sign: Annotated[Literal["positive", "negative"], WORD] | None = Field(
        default=None, description="Sign that theory expects of the coefficient; reported when contradicted."
    )


class KeepGroup(Block):
    """Predictors of which the last one standing may not be removed."""

    words: ClassVar[tuple[str, ...]] = ("because", "source")
    unordered: ClassVar[tuple[str, ...]] = ("at_least_one_of",)

    at_least_one_of: tuple[Annotated[str, NAME], ...] = Field(
        description="Two or more predictors.", min_length=2
    )
    because: Annotated[str, TEXT] = Field(description="The theory behind it.")
    source: Annotated[str, TEXT] | None = Field(default=None, description="Where the theory is written.")


KeepRule = Annotated[
    Annotated[KeepGroup, Tag(tag_of(KeepGroup))] | Annotated[KeepPredictor, Tag(tag_of(KeepPredictor))],
    by_shape(None, (KeepGroup, "at_least_one_of"), (KeepPredictor, "predictor")),
]
