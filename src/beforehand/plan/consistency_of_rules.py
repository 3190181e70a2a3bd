"""Checks of rules against the predictors they are about: products, theory, fills, ladders, expectations."""

from __future__ import annotations

import itertools
import math
from collections.abc import Callable, Iterator, Mapping, Sequence

from beforehand.plan.blocks import FillValue, Transforms
from beforehand.plan.complaint import Complaint, near, repeated, repeats, unknown
from beforehand.plan.model import Plan
from beforehand.plan.numbers import number_text
from beforehand.plan.places import keyed
from beforehand.plan.variables import KeepGroup, KeepPredictor, Predictor

# Shares of levels that an analyst writes down by hand add up to 1 only so far.
_SHARES_ADD_UP_TO = 0.01

# A matrix nearer to singular cannot be told from one that is, since its entries are rounded.
_SMALLEST_EIGENVALUE = 1e-10

_NEEDS = {
    "log": "numbers above 0",
    "box_cox": "numbers above 0",
    "reciprocal": "numbers other than 0",
    "square_root": "numbers not below 0",
}

Bounds = tuple[float | None, float | None]


def _columns(plan: Plan) -> dict[str, Predictor]:
    """Predictors by name, in plan order."""
    return {predictor.column: predictor for predictor in plan.predictors}


def _categories(plan: Plan) -> dict[str, Predictor]:
    """Predictors that are categories."""
    return {predictor.column: predictor for predictor in plan.predictors if predictor.kind == "category"}


def _products(plan: Plan) -> Iterator[Complaint]:
    """Two different predictors, each pair once."""
    columns = _columns(plan)
    for number, pair in enumerate(plan.products):
        place = f"products[{number}]"
        for side, name in enumerate(pair):
            if name not in columns:
                yield unknown(f"{place}[{side}]", name, columns)
        if pair[0] == pair[1]:
            what = f"multiplies {pair[0]!r} by itself; for a curve, transforms.try has square"
            yield Complaint(place, what, "products")
    for number, first, _ in repeats([frozenset(pair) for pair in plan.products]):
        yield Complaint(f"products[{number}]", f"names the product of products[{first}] again", "repeated")


def _keep_predictors(plan: Plan) -> Iterator[Complaint]:
    """Rules for one predictor or product: known, each once, with a sign only where there is one."""
    columns, categories = _columns(plan), _categories(plan)
    rules = [(number, rule) for number, rule in enumerate(plan.keep) if isinstance(rule, KeepPredictor)]
    for number, rule in rules:
        place, subject = f"keep[{number}]", rule.predictor
        if isinstance(subject, tuple):
            yield from _kept_product(plan, subject, f"{place}.predictor")
        elif subject == plan.outcome.column:
            what = f"names the outcome {subject!r}; rules keep predictors"
            yield Complaint(f"{place}.predictor", what, "outcome_used")
        elif subject not in columns:
            yield unknown(f"{place}.predictor", subject, columns)
        parts = (subject,) if isinstance(subject, str) else subject
        several = [name for name in parts if name in categories]
        if rule.expected_sign is not None and several:
            what = f"expects a sign of {several[0]!r}, a category, which has a coefficient for each level"
            yield Complaint(f"{place}.expected_sign", what, "kind")
    for position, first, subject in repeats([rule.predictor for _, rule in rules]):
        named = repr(subject) if isinstance(subject, str) else f"[{', '.join(subject)}]"
        what = f"has a second rule for {named} (first in keep[{rules[first][0]}])"
        yield Complaint(f"keep[{rules[position][0]}].predictor", what, "repeated")


def _kept_product(plan: Plan, pair: tuple[str, str], place: str) -> Iterator[Complaint]:
    """A product that is kept is one that the plan has, in the same order."""
    if pair in plan.products:
        return
    if pair[::-1] in plan.products:
        what = f"names [{pair[0]}, {pair[1]}]; products has it as [{pair[1]}, {pair[0]}]"
    else:
        what = f"names the product [{pair[0]}, {pair[1]}], which is not among the products"
    yield Complaint(place, what, "products")


def _keep_groups(plan: Plan) -> Iterator[Complaint]:
    """Groups of known predictors, none of them idle beside another rule."""
    columns, always = _columns(plan), _always_kept(plan)
    groups = {n: rule.at_least_one_of for n, rule in enumerate(plan.keep) if isinstance(rule, KeepGroup)}
    members = {number: frozenset(group) for number, group in groups.items()}
    starting_with: dict[str, list[int]] = {}
    for number, group in groups.items():
        starting_with.setdefault(min(group), []).append(number)
    for number, group in groups.items():
        place = f"keep[{number}].at_least_one_of"
        yield from repeated(place, group)
        for position, name in enumerate(group):
            if name not in columns:
                yield unknown(f"{place}[{position}]", name, columns)
        held = next((name for name in group if name in always), None)
        if held is not None:
            what = f"is idle: keep[{always[held]}] always keeps {held!r}, so one of the group always stays"
            yield Complaint(place, what, "idle")
        inside = (
            other
            for name in dict.fromkeys(group)
            for other in starting_with.get(name, ())
            if _makes_idle(members[other], members[number], earlier=other < number)
        )
        for other in itertools.islice(inside, 1):
            what = f"is idle: keep[{other}] keeps one of {', '.join(groups[other])} already"
            yield Complaint(place, what, "idle")


def _makes_idle(inner: frozenset[str], outer: frozenset[str], *, earlier: bool) -> bool:
    """Whether a group is inside another one; of two equal groups the first counts."""
    return inner < outer or (inner == outer and earlier)


def _always_kept(plan: Plan) -> dict[str, int]:
    """Predictors that always stay, with the rule: named by it, or part of a product that is."""
    kept: dict[str, int] = {}
    for number, rule in enumerate(plan.keep):
        if isinstance(rule, KeepPredictor) and rule.rule == "always":
            for name in (rule.predictor,) if isinstance(rule.predictor, str) else rule.predictor:
                kept.setdefault(name, number)
    return kept


def _fills(plan: Plan) -> Iterator[Complaint]:
    """Fills for known predictors, of a kind that can be learned or written there."""
    columns, categories = _columns(plan), _categories(plan)
    numbers = {predictor.column: predictor for predictor in plan.predictors if predictor.kind == "number"}
    for name, fill in plan.missing_data.fill.items():
        place = keyed("missing_data.fill", name)
        if name == plan.outcome.column:
            yield Complaint(place, "fills the outcome; rows without an outcome leave", "outcome_used")
        elif name not in columns:
            yield unknown(place, name, columns)
        elif isinstance(fill, FillValue):
            holder = categories.get(name) or numbers[name]
            yield from _fill_value(fill.value, holder, f"{place}.value")
        elif name in categories and fill != "most_common":
            what = f"is {fill}, but {name!r} is a category; it can be filled with most_common or a level"
            yield Complaint(place, what, "kind")


def _fill_value(value: float | str, predictor: Predictor, place: str) -> Iterator[Complaint]:
    """A value that the predictor can have."""
    if predictor.kind == "category":
        if predictor.levels and not (isinstance(value, str) and value in predictor.levels):
            text = value if isinstance(value, str) else number_text(value)
            hint = f"; write {text!r} in quotes" if text in predictor.levels else near(text, predictor.levels)
            what = f"is {text!r}, which is not among the levels of {predictor.column!r}{hint}"
            yield Complaint(place, what, "levels")
    elif isinstance(value, str):
        yield Complaint(place, f"is {value!r}, but {predictor.column!r} is a number", "kind")
    elif not _inside(value, predictor.range):
        yield Complaint(place, f"is {number_text(value)}, outside the range of {predictor.column!r}", "range")


def _inside(value: float, bounds: Bounds | None) -> bool:
    """Whether a number lies in a declared range."""
    low, high = bounds or (None, None)
    return (low is None or value >= low) and (high is None or value <= high)


def _ladder_of_outcome(plan: Plan) -> Iterator[Complaint]:
    """Every rung for the outcome must apply to its declared range."""
    for number, rung in enumerate(plan.outcome.transforms):
        if not can_apply(rung, plan.outcome.range):
            place = f"outcome.transforms[{number}]"
            yield Complaint(place, _out_of_reach(rung, plan.outcome.column, plan.outcome.range), "ladder")


def _ladder_of_predictors(plan: Plan) -> Iterator[Complaint]:
    """Some rung must apply to each declared range, and each rung to some predictor.

    A rung that one predictor cannot take is no fault while it has others to try: the run records it
    as not applicable there.
    """
    ladder = plan.transforms.try_
    if "transforms" not in plan.steps or not plan.transforms.when or not ladder:
        return
    numeric = [(number, p) for number, p in enumerate(plan.predictors) if p.kind == "number"]
    for number, predictor in numeric:
        if not any(can_apply(rung, predictor.range) for rung in ladder):
            what = _out_of_reach(ladder[0], predictor.column, predictor.range)
            rest = "" if len(ladder) == 1 else ", and no other rung in transforms.try can either"
            yield Complaint(f"predictors[{number}].range", what + rest, "ladder")
    # The default ladder is nobody's claim about this table.
    if numeric and len(ladder) > 1 and ladder != Transforms.defaults().try_:
        for number, rung in enumerate(ladder):
            if not any(can_apply(rung, predictor.range) for _, predictor in numeric):
                what = f"is {rung}, which needs {_NEEDS[rung]}; no predictor's declared range has only such"
                yield Complaint(f"transforms.try[{number}]", what, "ladder")


def can_apply(rung: str, bounds: Bounds | None) -> bool:
    """Whether a rung is defined on all of a declared range; an open end leaves it to the data."""
    low, high = bounds or (None, None)
    if rung in ("log", "box_cox"):
        return (low is None or low > 0.0) and (high is None or high > 0.0)
    if rung == "square_root":
        return (low is None or low >= 0.0) and (high is None or high >= 0.0)
    if rung == "reciprocal":
        reaches_from_below = low is not None and low <= 0.0 and (high is None or high >= 0.0)
        return not (reaches_from_below or high == 0.0)
    return True


def _out_of_reach(rung: str, name: str, bounds: Bounds | None) -> str:
    """Why a rung cannot apply to a declared range."""
    low, high = bounds or (None, None)
    start = "an open end" if low is None else number_text(low)
    end = "an open end" if high is None else number_text(high)
    return f"lets {name!r} run from {start} to {end}, but {rung} needs {_NEEDS[rung]}"


def _expected_slopes(plan: Plan) -> Iterator[Complaint]:
    """Slopes of known predictors, for a category level by level."""
    columns, categories = _columns(plan), _categories(plan)
    for name, slope in plan.expects.slopes.items() if plan.expects is not None else ():
        place = keyed("expects.slopes", name)
        if name not in columns:
            yield unknown(place, name, columns)
        elif isinstance(slope, Mapping):
            yield from _expected_differences(slope, columns[name], place)
        elif name in categories:
            what = (
                f"gives a slope to {name!r}, which is a category; "
                f"give its levels their differences from {categories[name].baseline!r}, {{level: number}}"
            )
            yield Complaint(place, what, "kind")


def _expected_differences(
    differences: Mapping[str, float], predictor: Predictor, place: str
) -> Iterator[Complaint]:
    """Differences of declared levels from the baseline, which has none from itself."""
    if predictor.kind == "number":
        yield Complaint(place, f"gives levels to {predictor.column!r}, which is a number", "kind")
        return
    for level, difference in differences.items():
        if level not in predictor.levels:
            yield _unknown_level(place, level, predictor)
        elif level == predictor.baseline and difference != 0.0:
            what = f"is {number_text(difference)}, but {level!r} is the baseline that the others differ from"
            yield Complaint(keyed(place, level), what, "levels")


def _unknown_level(place: str, level: str, predictor: Predictor) -> Complaint:
    """A level that the predictor does not have."""
    hint = near(level, predictor.levels)
    what = f"names {level!r}, which is not among the levels of {predictor.column!r}{hint}"
    return Complaint(keyed(place, level), what, "levels")


def _expected_predictors(plan: Plan) -> Iterator[Complaint]:
    """What is expected of known predictors, as their kind has it."""
    columns = _columns(plan)
    expected = (plan.expects.predictors if plan.expects is not None else None) or {}
    for name, about in expected.items():
        place = keyed("expects.predictors", name)
        if name not in columns:
            yield unknown(place, name, columns)
        elif columns[name].kind == "number":
            if about.shares:
                yield Complaint(f"{place}.shares", f"belongs to a category, but {name!r} is a number", "kind")
        else:
            for key, value in (("mean", about.mean), ("sd", about.sd)):
                if value is not None:
                    what = f"belongs to a number, but {name!r} is a category"
                    yield Complaint(f"{place}.{key}", what, "kind")
            yield from _expected_shares(about.shares, columns[name], f"{place}.shares")


def _expected_shares(shares: Mapping[str, float], predictor: Predictor, place: str) -> Iterator[Complaint]:
    """Shares of declared levels that add up to 1."""
    for level in shares:
        if level not in predictor.levels:
            yield _unknown_level(place, level, predictor)
    total = math.fsum(shares.values())
    if shares and abs(total - 1.0) > _SHARES_ADD_UP_TO:
        yield Complaint(place, f"add up to {total:.3g}; shares add up to 1", "shares")


def _expected_correlations(plan: Plan) -> Iterator[Complaint]:
    """Correlations of two known numbers, each pair once, that can all hold at once."""
    columns = _columns(plan)
    lines = plan.expects.correlations if plan.expects is not None else ()
    sound = True
    for number, line in enumerate(lines):
        place = f"expects.correlations[{number}].between"
        for side, name in enumerate(line.between):
            if name not in columns:
                sound = False
                yield unknown(f"{place}[{side}]", name, columns)
            elif columns[name].kind == "category":
                what = f"names {name!r}, a category; correlations are of numbers"
                sound = False
                yield Complaint(f"{place}[{side}]", what, "kind")
        if line.between[0] == line.between[1]:
            what = f"names {line.between[0]!r} twice; a correlation is of two"
            sound = False
            yield Complaint(place, what, "correlations")
    for number, first, _ in repeats([frozenset(line.between) for line in lines]):
        what = f"names the pair of expects.correlations[{first}] again"
        yield Complaint(f"expects.correlations[{number}]", what, "repeated")
        sound = False
    if sound and lines and not _can_hold([(*line.between, line.r) for line in lines]):
        what = "cannot all hold at once: with 0 for the other pairs, the matrix is not positive definite"
        yield Complaint("expects.correlations", what, "correlations")


def _can_hold(correlations: Sequence[tuple[str, str, float]]) -> bool:
    """Whether a correlation matrix of these, and of 0 elsewhere, is positive definite."""
    import numpy as np

    names = sorted({name for first, second, _ in correlations for name in (first, second)})
    place = {name: number for number, name in enumerate(names)}
    matrix = np.eye(len(names))
    for first, second, r in correlations:
        matrix[place[first], place[second]] = matrix[place[second], place[first]] = r
    return bool(np.linalg.eigvalsh(matrix)[0] > _SMALLEST_EIGENVALUE)


CHECKS: tuple[Callable[[Plan], Iterator[Complaint]], ...] = (
    _products,
    _keep_predictors,
    _keep_groups,
    _fills,
    _ladder_of_outcome,
    _ladder_of_predictors,
    _expected_slopes,
    _expected_predictors,
    _expected_correlations,
)
