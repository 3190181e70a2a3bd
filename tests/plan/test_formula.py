"""Formulas of derived columns: grammar, one normal text, and values with missing cells."""

from __future__ import annotations

import contextlib
import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from beforehand.plan import FormulaError, evaluate, names_in, parse_formula
from beforehand.plan.arithmetic import Call, Expression, Name, Negative, Number, Operation, written

NAN = math.nan


def values_of(formula: str, **columns: list[float]) -> list[float]:
    """Evaluate over columns given as lists."""
    arrays = {name: np.array(cells, dtype=np.float64) for name, cells in columns.items()}
    found: list[float] = evaluate(parse_formula(formula), arrays).tolist()
    return found


@pytest.mark.parametrize(
    ("formula", "expected"),
    [
        ("a - b", [1.0, -5.0, NAN]),
        ("a + 2 * b", [7.0, 7.0, NAN]),
        ("-a ^ 2", [-9.0, -1.0, NAN]),
        ("(-a) ^ 2", [9.0, 1.0, NAN]),
        ("2 ^ -b", [0.25, 2.0**-4, NAN]),
        ("2 ^ 3 ^ 0", [2.0, 2.0, 2.0]),
        ("b ^ 0.5", [math.sqrt(2), 2.0, NAN]),
        ("a ^ 0.5", [math.sqrt(3), NAN, NAN]),
        ("a ^ 3", [27.0, -1.0, NAN]),
        ("a ^ -1", [1 / 3, -1.0, NAN]),
        ("zero ^ -1", [NAN, NAN, NAN]),
        ("a / zero", [NAN, NAN, NAN]),
        ("zero / zero", [NAN, NAN, NAN]),
        ("log(a)", [math.log(3), NAN, NAN]),
        ("log(zero)", [NAN, NAN, NAN]),
        ("sqrt(a)", [math.sqrt(3), NAN, NAN]),
        ("sqrt(zero)", [0.0, 0.0, 0.0]),
        ("abs(a)", [3.0, 1.0, NAN]),
        ("min(a, b, 2.5)", [2.0, -1.0, NAN]),
        ("max(a, b)", [3.0, 4.0, NAN]),
        ("a > b", [1.0, 0.0, NAN]),
        ("a <= b", [0.0, 1.0, NAN]),
        ("a == 3", [1.0, 0.0, NAN]),
        ("a != 3", [0.0, 1.0, NAN]),
        ("(a > 0) * b", [2.0, 0.0, NAN]),
        ("1e308 * (a + 20)", [NAN, NAN, NAN]),
        ("8 / 4 / 2 + zero", [1.0, 1.0, 1.0]),
        ("a - b - 1", [0.0, -6.0, NAN]),
    ],
)
def test_values(formula: str, expected: list[float]) -> None:
    """A cell that is missing, or has no finite value, is missing; all others are plain arithmetic."""
    found = values_of(formula, a=[3.0, -1.0, NAN], b=[2.0, 4.0, NAN], zero=[0.0, 0.0, 0.0])
    np.testing.assert_array_equal(np.broadcast_to(found, 3), expected)


def test_a_half_missing_maximum_is_missing() -> None:
    """A smallest or largest of something missing is not known."""
    assert math.isnan(values_of("max(a, 1)", a=[NAN])[0])
    assert math.isnan(values_of("min(1, a)", a=[NAN])[0])


def test_an_infinite_step_is_missing() -> None:
    """A step beyond the largest double is missing even where a later one would come back."""
    assert math.isnan(values_of("1 / (1 / a)", a=[0.0])[0])
    assert math.isnan(values_of("min(1, a ^ 9)", a=[1e300])[0])


def test_columns_are_left_alone() -> None:
    """Evaluating writes into no column."""
    column = np.array([1.0, -2.0])
    evaluate(parse_formula("abs(a) + sqrt(a)"), {"a": column})
    assert column.tolist() == [1.0, -2.0]


@pytest.mark.parametrize(
    ("formula", "names"),
    [
        ("outdoor_temp - set_point", ("outdoor_temp", "set_point")),
        ("'set point (°C)' - a.b + 'it''s'", ("set point (°C)", "a.b", "it's")),
        ("log(log) + min + min(a, a)", ("log", "min", "a")),
        ("Größe * 2", ("Größe",)),
        ("1 + 2", ()),
    ],
)
def test_names(formula: str, names: tuple[str, ...]) -> None:
    """Columns are named once each, in the order in which they first stand."""
    assert names_in(parse_formula(formula)) == names


@pytest.mark.parametrize(
    ("formula", "text"),
    [
        ("a-b", "a - b"),
        ("(a) *(b)", "a * b"),
        ("a-(b-c)", "a - (b - c)"),
        ("(a-b)-c", "a - b - c"),
        ("a/(b*c)", "a / (b * c)"),
        ("-(a+b)", "-(a + b)"),
        ("(-a)^2", "(-a) ^ 2"),
        ("-a^2", "-a ^ 2"),
        ("a^b^c", "a ^ b ^ c"),
        ("(a^b)^c", "(a ^ b) ^ c"),
        ("2^-b", "2 ^ -b"),
        ("(a<b)*c", "(a < b) * c"),
        ("(a<b)==(c<d)", "(a < b) == (c < d)"),
        ("min(a,b)", "min(a, b)"),
        ("'plain'", "plain"),
        ("'set point'*1.50", "'set point' * 1.5"),
        ("'it''s'", "'it''s'"),
    ],
)
def test_one_text(formula: str, text: str) -> None:
    """The normal text has no needless brackets, and reads back as the same tree."""
    tree = parse_formula(formula)
    assert written(tree) == text
    assert parse_formula(text) == tree


@pytest.mark.parametrize(
    ("formula", "message"),
    [
        ("", "is empty"),
        ("a b", "has 'b' at character 3, where it cannot stand"),
        ("a = b", "has a single = at character 3; a comparison is written =="),
        ("a < b < c", "has a second comparison at character 7; put one of them in brackets"),
        ("'a", "opens a quote at character 1 that is never closed"),
        ("''", "has an empty name in quotes at character 1"),
        ("`set point`", "has '`' at character 1; a name with blanks or signs stands in 'single quotes'"),
        ('"a"', "has '\"' at character 1; a name with blanks or signs stands in 'single quotes'"),
        ("a % b", "has '%' at character 3, which has no meaning here"),
        ("exp(a)", "uses 'exp' as a function; there is only log, sqrt, abs, min, max"),
        ("min(a)", "gives min 1 operands; it takes at least 2"),
        ("log(a, b)", "gives log 2 operands; it takes 1"),
        ("a + ", "ends where a number, a name or a bracket is expected"),
        ("a ** b", "has '*' at character 4, where it cannot stand"),
        ("a.__class__()", "uses 'a.__class__' as a function; there is only log, sqrt, abs, min, max"),
        ("lambda: 0", "has ':' at character 7, which has no meaning here"),
        ("[a]", "has '[' at character 1, which has no meaning here"),
        ("a; b", "has ';' at character 2, which has no meaning here"),
    ],
)
def test_refused(formula: str, message: str) -> None:
    """Whatever is not of the grammar is refused with its character."""
    with pytest.raises(FormulaError) as refused:
        parse_formula(formula)
    assert str(refused.value) == message


def test_whole_powers_are_multiplied_out() -> None:
    """A whole power is the product, whatever the library's power function does on this machine."""
    cells = [1.1, -2.3, 1e-3, 7.7]
    assert values_of("a ^ 2", a=cells) == [cell * cell for cell in cells]
    assert values_of("a ^ 3", a=cells) == [cell * (cell * cell) for cell in cells]


NAMES = st.sampled_from(["a", "b", "set point", "it's", "log"])


def trees() -> st.SearchStrategy[Expression]:
    """Random trees of the grammar."""
    leaves: st.SearchStrategy[Expression] = st.one_of(
        st.builds(Number, st.floats(min_value=0, max_value=1e12, allow_nan=False)),
        st.builds(Name, NAMES),
    )

    def grow(inner: st.SearchStrategy[Expression]) -> st.SearchStrategy[Expression]:
        return st.one_of(
            st.builds(Negative, inner),
            st.builds(
                Operation,
                st.sampled_from(["+", "-", "*", "/", "^", "<", "<=", ">", ">=", "==", "!="]),
                inner,
                inner,
            ),
            st.builds(lambda name, one: Call(name, (one,)), st.sampled_from(["log", "sqrt", "abs"]), inner),
            st.builds(
                lambda name, one, two: Call(name, (one, two)), st.sampled_from(["min", "max"]), inner, inner
            ),
        )

    return st.recursive(leaves, grow, max_leaves=12)


@given(trees())
def test_writing_and_parsing_are_inverse(tree: Expression) -> None:
    """Whatever the tree, its text reads back as that tree: no bracket is missing."""
    assert parse_formula(written(tree)) == tree


@given(trees())
def test_values_are_finite_or_missing(tree: Expression) -> None:
    """No formula gives an infinite cell or fails."""
    columns = {name: np.array([0.0, -1.5, NAN, 1e300]) for name in ["a", "b", "set point", "it's", "log"]}
    assert not np.isinf(evaluate(tree, columns)).any()


@given(st.text(max_size=30))
def test_any_text_is_a_formula_or_refused(text: str) -> None:
    """No text makes the parser fail in any other way."""
    with contextlib.suppress(FormulaError):
        parse_formula(text)
