from __future__ import annotations

import typing
from collections.abc import Iterator, Mapping
from typing import Any

import pytest

from beforehand.comparing.grades import GRADES
from beforehand.comparing.grading import graded
from beforehand.comparing.rules import GRADES_IN_ORDER, Always, Ends, Inside, Items, Number, Words
from beforehand.plan import Limit, Plan
from beforehand.plan.block import Block


def blocks_in(annotation: Any) -> Iterator[type[Block]]:
    """Every block that can stand in a field, however deep in its type."""
    if isinstance(annotation, type) and issubclass(annotation, Block):
        yield annotation
    for inner in typing.get_args(annotation):
        yield from blocks_in(inner)


def fields_of(block: type[Block], path: str = "") -> Iterator[tuple[str, Any]]:
    """Every field of the language under its place, by the models."""
    for name, field in block.model_fields.items():
        here = f"{path}.{field.alias or name}" if path else field.alias or name
        annotations = [field.annotation, *field.metadata]
        yield here, field
        for inner in dict.fromkeys(found for one in annotations for found in blocks_in(one)):
            yield from fields_of(inner, here)


FIELDS = dict(fields_of(Plan))


def test_every_field_of_the_language_has_a_grade_and_no_other():
    """The table keeps step with the models of the plan, in both directions."""
    assert set(GRADES) == set(FIELDS)


def test_the_walk_over_the_models_reaches_their_depths():
    """The check above would be idle if the walk missed what stands in unions, lists and mappings."""
    deep = {
        "missing_data.fill.value",
        "keep.rule.unless_p_above",
        "keep.at_least_one_of",
        "errors.cluster_by",
        "expects.predictors.shares",
        "assumptions.independence.between",
        "transforms.try",
        "amendments.why",
    }
    assert deep <= set(FIELDS)


def test_what_the_language_calls_words_is_graded_as_wording():
    """The models say which fields no number depends on; the table agrees with each."""

    def words(block: type[Block], path: str) -> Iterator[tuple[str, bool]]:
        for name, field in block.model_fields.items():
            here = f"{path}.{field.alias or name}" if path else field.alias or name
            yield here, name in block.words
            for inner in blocks_in(field.annotation):
                # All that stands in a list of words is words.
                if name not in block.words:
                    yield from words(inner, here)

    for path, is_words in words(Plan, ""):
        rule = GRADES[path]
        grades = (
            {rule.grade}
            if isinstance(rule, Always)
            else {rule.came, rule.went}
            if isinstance(rule, Items)
            else set()
        )
        assert (grades == {"wording"}) is is_words, path


def test_lists_whose_order_means_nothing_are_graded_so():
    """The models name them."""

    def lists(block: type[Block], path: str) -> Iterator[tuple[str, bool]]:
        for name, field in block.model_fields.items():
            here = f"{path}.{field.alias or name}" if path else field.alias or name
            yield here, name in block.unordered or name == "amendments"
            for inner in blocks_in(field.annotation):
                yield from lists(inner, here)

    for path, unordered in lists(Plan, ""):
        rule = GRADES[path]
        if isinstance(rule, Items) and rule.order is not None:
            assert (rule.order == "wording") is unordered, path


def test_every_rule_gives_its_reasons():
    """A grade without a reason would tell a reviewer nothing."""
    for path, rule in GRADES.items():
        if isinstance(rule, Inside):
            continue
        texts = [getattr(rule, name) for name in type(rule).__slots__]
        reasons = [text for text in texts if isinstance(text, str) and text not in GRADES_IN_ORDER]
        assert reasons, path
        assert all(reason and not reason.endswith(".") for reason in reasons), path


def test_the_words_of_a_choice_are_words_of_the_language():
    """A ranked word that the language does not know would never be met."""

    def literals(annotation: Any) -> set[object]:
        if typing.get_origin(annotation) is typing.Literal:
            return set(typing.get_args(annotation))
        return {word for inner in typing.get_args(annotation) for word in literals(inner)}

    for path, rule in GRADES.items():
        if isinstance(rule, Words):
            field = FIELDS[path]
            known = literals(field.annotation) | {None, True, False, "any other", "robust_errors"}
            assert set(rule.order) <= known, path


NUMBER = Number(up="looser", looser="more passes", stricter="less passes")


@pytest.mark.parametrize(
    ("old", "new", "grade"),
    [
        (0.05, 0.1, "looser"),
        (0.1, 0.05, "stricter"),
        (5.0, None, "looser"),
        (None, 5.0, "stricter"),
        (Limit.of("4/n"), Limit.of("5/n"), "looser"),
        (Limit.of("3*p/n"), Limit.of("2*p/n"), "stricter"),
        # 4/n is the larger on few rows, 0.01 on many: no table is known yet.
        (Limit.of("4/n"), Limit.of("0.01"), "different"),
        (Limit.of("4/n"), Limit.of("8/(2*n)"), "different"),
        (Limit.of("4/n"), None, "looser"),
        (Limit.of(3), Limit.of(2), "stricter"),
        # Without a value on small tables, larger on all others.
        (Limit.of("4/n"), Limit.of("4/(n - 199)"), "different"),
    ],
)
def test_numbers_and_limits_by_their_size(old, new, grade):
    """Null is a limit that nothing reaches; formulas are compared on tables of many sizes."""
    assert [found.grade for found in graded(NUMBER, old, new)] == [grade]


@pytest.mark.parametrize(
    ("old", "new", "grades"),
    [
        ((0.0, 100.0), (0.0, 200.0), ["looser"]),
        ((0.0, 100.0), (None, 100.0), ["looser"]),
        ((0.0, 100.0), None, ["looser"]),
        (None, (0.0, None), ["stricter"]),
        ((0.0, 100.0), (10.0, 90.0), ["stricter"]),
        ((0.0, 100.0), (10.0, 200.0), ["looser", "stricter"]),
    ],
)
def test_ranges_by_their_ends(old, new, grades):
    """Wider is looser, narrower stricter; a shifted range is both."""
    rule = Ends(looser="more values", stricter="fewer values")
    assert [found.grade for found in graded(rule, old, new)] == grades


def test_choices_by_their_rank():
    """From strict to loose; two values of one rank are different."""
    rule: Mapping[str, Words] = {name: one for name, one in GRADES.items() if isinstance(one, Words)}
    multiplicity, order = rule["multiplicity"], rule["assumptions.independence.in_order_of"]
    assert [found.grade for found in graded(multiplicity, "holm", "benjamini_hochberg")] == ["looser"]
    assert [found.grade for found in graded(multiplicity, "none", "holm")] == ["stricter"]
    assert [found.grade for found in graded(order, "day", None)] == ["looser"]
    assert [found.grade for found in graded(order, None, "day")] == ["stricter"]
    assert [found.grade for found in graded(order, "day", "hour")] == ["different"]
    sign = rule["influence.remove_when.sign_changes"]
    assert [found.grade for found in graded(sign, False, True)] == ["looser"]
