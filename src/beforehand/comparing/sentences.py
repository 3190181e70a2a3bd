"""What a comparison says in words, once for the terminal and for a comment on a proposed change."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from beforehand.comparing.locks import FatePair, LockComparison
from beforehand.comparing.paths import RulingPair
from beforehand.comparing.rules import GRADES_IN_ORDER
from beforehand.comparing.whole import Comparison
from beforehand.wording import RUNG_WORDS, plural

# So many rows, rulings or predictors are named; the JSON form has them all.
MOST_NAMED = 12

STATUS_WORDS = {
    "adopted": "a model is adopted",
    "mean_only": "the mean is the answer",
    "inconclusive": "the model is too weak to answer",
    "stopped": "a rule ends the run",
}
FIGURE_WORDS = {
    "rows": "Rows used",
    "r_squared": "Variance explained (R²)",
    "adjusted_r_squared": "R² adjusted",
    "predicted_r_squared": "R² leaving each row out",
    "residual_sd": "Typical error",
}


@dataclass(frozen=True, slots=True, kw_only=True)
class Fact:
    """One line about two records: a label of a word or two, and a sentence."""

    label: str
    says: str


def summary(compared: Comparison) -> str:
    """How many changes have which grade, in one sentence."""
    if compared.same:
        return "Nothing differs."
    if not compared.changes:
        return "The plans say the same; their records differ."
    counts = [(compared.counts[grade], grade) for grade in GRADES_IN_ORDER if compared.counts[grade]]
    told = ", ".join(f"{count:,} {grade}" for count, grade in counts)
    return f"{plural(len(compared.changes), 'change')} of the plan: {told}."


def facts(locks: LockComparison) -> tuple[Fact, ...]:
    """Everything but the tables of numbers, in the order in which a reviewer asks."""
    found = [Fact(label="Status", says=_status(locks)), Fact(label="Data", says=_data(locks))]
    if locks.ledger:
        stages = [f"{one.stage} {_count(one.old)} before, {_count(one.new)} now" for one in locks.ledger]
        found.append(Fact(label="Rows", says=f"{'; '.join(stages)}."))
    if not locks.data.comparable and (locks.rows_came or locks.rows_went):
        found.append(Fact(label="Rows", says="The same label may be another row: the tables differ."))
    if locks.rows_went:
        found.append(Fact(label="Rows", says=f"Removed now and not before: {_named(locks.rows_went)}."))
    if locks.rows_came:
        found.append(Fact(label="Rows", says=f"Removed before and not now: {_named(locks.rows_came)}."))
    found += [Fact(label="Predictor", says=_fate(fate)) for fate in locks.predictors]
    if locks.parting is not None:
        found.append(Fact(label="Paths part", says=_parting(locks.parting)))
    flips = [pair for pair in locks.flipped if pair != locks.parting]
    found += [Fact(label="Flips", says=_flip(pair)) for pair in flips[:MOST_NAMED]]
    if len(flips) > MOST_NAMED:
        found.append(Fact(label="Flips", says=f"{len(flips) - MOST_NAMED:,} more rulings flip."))
    found += [
        Fact(
            label="Alternative",
            says=f"{one.alternative}: {_holding(one.old)} before, {_holding(one.new)} now.",
        )
        for one in locks.alternatives
    ]
    if locks.sections:
        found.append(Fact(label="Record", says=f"Differs in {', '.join(locks.sections)}."))
    return tuple(found)


def _status(locks: LockComparison) -> str:
    """How both runs ended."""
    old, new = (STATUS_WORDS[status] for status in (locks.old_status, locks.new_status))
    if locks.old_status == locks.new_status:
        return f"The same: {old}."
    return f"{old} before, {new} now.".capitalize()


def _data(locks: LockComparison) -> str:
    """Whether the same values were read."""
    data = locks.data
    if data.same:
        return f"The same values, {plural(data.old_rows, 'row')}."
    return f"Other values: {plural(data.old_rows, 'row')} before, {data.new_rows:,} now."


def _parting(pair: RulingPair) -> str:
    """The first decision that goes another way."""
    if pair.old is None or pair.new is None:
        one, side = pair.either, "now" if pair.old is None else "before"
        return f"At {one.id}, which only the run {side} has to decide: {_clause(one.says)}."
    return f"At {pair.old.id}. Before: {_clause(pair.old.says)}. Now: {_clause(pair.new.says)}."


def _flip(pair: RulingPair) -> str:
    """One decision with another verdict."""
    old, new = pair.old, pair.new
    if old is None or new is None:
        return pair.either.says
    return f"{old.id} before: {_clause(old.says)}. {new.id} now: {_clause(new.says)}."


def _clause(says: str) -> str:
    """A sentence as a part of another one."""
    return says.removesuffix(".")


def _count(rows: int | None) -> str:
    return "no such stage" if rows is None else f"{rows:,}"


def _fate(fate: FatePair) -> str:
    """How one predictor ended in both runs."""
    return (
        f"{fate.predictor}: {_ending(fate.old, fate.old_transform)} before, "
        f"{_ending(fate.new, fate.new_transform)} now."
    )


def _ending(verdict: str | None, transform: str | None) -> str:
    if verdict is None:
        return "not in the plan"
    words = verdict.replace("_", " ")
    return words if transform is None else f"{words} {RUNG_WORDS.get(transform, transform)}"


def _holding(holds: bool | None) -> str:
    if holds is None:
        return "not declared"
    return "the answer holds" if holds else "the answer does not hold"


def _named(labels: Sequence[str]) -> str:
    """Labels of rows, the last of many only counted."""
    if len(labels) <= MOST_NAMED:
        return ", ".join(labels)
    return f"{', '.join(labels[:MOST_NAMED])} and {len(labels) - MOST_NAMED:,} more"
