"""Limits such as 4/n: what they mean, how they are written, and what is refused."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from beforehand.faults import NumericalError
from beforehand.plan import FormulaError, Limit


@pytest.mark.parametrize(
    ("written", "value"),
    [
        ("4/n", 4 / 60),
        ("3*p/n", 3 * 4 / 60),
        ("2*sqrt(p/n)", 2 * math.sqrt(4 / 60)),
        ("2 - 1 - 0.5", 0.5),
        ("8/4/2", 1.0),
        ("2*(n - p)/n", 2 * 56 / 60),
        ("1e-3", 0.001),
        (".5", 0.5),
        ("--3", 3.0),
        ("+3", 3.0),
        (3, 3.0),
        (0.25, 0.25),
    ],
)
def test_value(written: str | float, value: float) -> None:
    """A limit is plain arithmetic in n and p, from the left, products before sums."""
    assert Limit.of(written).value(n=60, p=4) == value


@pytest.mark.parametrize(
    ("written", "text"),
    [
        (" 3 *p / n ", "3*p/n"),
        ("((4))/(n)", "4/n"),
        ("2*sqrt( p/n )", "2*sqrt(p/n)"),
        ("n-(p-1)", "n - (p - 1)"),
        ("(n-p)+1", "n - p + 1"),
        ("4/(n*p)", "4/(n*p)"),
        ("(4/n)*p", "4/n*p"),
        ("3.0", "3"),
        (3, "3"),
        ("2e0", "2"),
        ("0.000001", "1e-06"),
    ],
)
def test_one_text(written: str | float, text: str) -> None:
    """Blanks and needless brackets leave no trace, and the text reads back as the same limit."""
    limit = Limit.of(written)
    assert limit.text == text
    assert Limit.of(limit.text) == limit


@pytest.mark.parametrize(
    ("written", "message"),
    [
        ("4/m", "has 'm', but only n and p have a meaning here"),
        ("4/nn", "has 'nn', but only n and p have a meaning here (nearest: 'n')"),
        ("exp(n)", "uses 'exp' as a function; there is only sqrt"),
        ("4^n", "has ^ at character 2, which has no meaning here"),
        ("n < p", "has a comparison at character 3, which has no meaning here"),
        ("'n'", 'has "\'" at character 1, which has no meaning here'),
        ("4/", "ends where a number, a name or a bracket is expected"),
        ("(4/n", "has a bracket that is never closed"),
        ("4/n)", "has ')' at character 4, where it cannot stand"),
        ("4 n", "has 'n' at character 3, where it cannot stand"),
        ("4,n", "has ',' at character 2, where it cannot stand"),
        ("sqrt(n, p)", "gives sqrt 2 operands; it takes 1"),
        ("sqrt()", "has ')' at character 6, where it cannot stand"),
        ("", "is empty"),
        ("  ", "is empty"),
        ("4//n", "has '/' at character 3, where it cannot stand"),
        ("4/n;", "has ';' at character 4, which has no meaning here"),
        ("1e999", "has a number at character 1 that is too large"),
        ("__import__('os')", 'has "\'" at character 12, which has no meaning here'),
        ("0", "is not above 0"),
        ("-3", "is not above 0"),
        (0, "is not above 0"),
        (-2.0, "is not above 0"),
        ("p - n", "is not above 0 for a table of 1000 rows and 7 coefficients"),
        ("4/(n - 1000)", "is not above 0 for a table of 1000 rows and 7 coefficients"),
        ("sqrt(p - n)", "is not above 0 for a table of 1000 rows and 7 coefficients"),
        (math.nan, "is not a finite number"),
        (math.inf, "is not a finite number"),
        ("1+" * 500 + "1", "is longer than 1000 characters"),
        ("(" * 61 + "n" + ")" * 61, "is nested deeper than 60"),
        ("-" * 61 + "n", "is nested deeper than 60"),
        ("+".join(["n"] * 62), "is nested deeper than 60"),
    ],
)
def test_refused(written: str | float, message: str) -> None:
    """Whatever is not of the grammar, or is no limit, is refused with what is wrong."""
    with pytest.raises(FormulaError) as refused:
        Limit.of(written)
    assert str(refused.value) == message


def test_no_value() -> None:
    """A limit without a finite value for a table says so, rather than giving one that means nothing."""
    with pytest.raises(NumericalError) as refused:
        Limit.of("1/(n - p)").value(n=5, p=5)
    assert str(refused.value) == "the limit 1/(n - p) has no value with 5 rows and 5 coefficients"


def test_constant() -> None:
    """A limit that is a number is told from one that depends on the table."""
    assert Limit.of("3").constant == 3.0
    assert Limit.of("4/n").constant is None


def test_limits_are_values() -> None:
    """Limits with the same text are equal and hash alike."""
    assert Limit.of("4/n") == Limit.of("4 / n")
    assert len({Limit.of("4/n"), Limit.of("(4/n)")}) == 1


@given(st.text(alphabet="np0123456789.+-*/()eE sqrt^<,'", max_size=40))
def test_any_text_is_a_limit_or_refused(written: str) -> None:
    """No text makes the parser fail in any other way, and what it reads has one stable text."""
    try:
        limit = Limit.of(written)
    except FormulaError:
        return
    assert Limit.of(limit.text) == limit
