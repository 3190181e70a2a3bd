"""The formatter of numbers."""

from __future__ import annotations

import math

import pytest
import yaml
from hypothesis import given
from hypothesis import strategies as st

from beforehand.lock.numbers import as_recorded, exact_text, number_text

finite = st.floats(allow_nan=False, allow_infinity=False)


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (6.41, "6.41"),
        (0.05, "0.05"),
        (38.210344170001, "38.21034417"),
        (1e-5, "1.0e-05"),
        (0.0001, "0.0001"),
        (1.2345678909e22, "1.234567891e+22"),
        (1e22, "1.0e+22"),
        (1234567890.0, "1234567890.0"),
        (12345678901.0, "1.23456789e+10"),
        (3.0, "3.0"),
        (0.0, "0.0"),
        (-0.0, "0.0"),
        (-1e-300, "-1.0e-300"),
        (2.0 / 3.0, "0.6666666667"),
        (5e-324, "4.940656458e-324"),
    ],
)
def test_numbers_have_ten_digits_a_dot_and_a_signed_exponent(value: float, text: str) -> None:
    """Every number is written in the one form that all readers take for a float."""
    assert number_text(value) == text


@pytest.mark.parametrize("value", [math.inf, -math.inf, math.nan])
@pytest.mark.parametrize("write", [number_text, exact_text])
def test_numbers_that_are_not_finite_are_refused(write, value: float) -> None:
    """NaN and infinity never get into a lock."""
    with pytest.raises(ValueError, match=r"^a lock holds finite numbers only, not -?(inf|nan)$"):
        write(value)


def test_largest_double_stays_finite() -> None:
    """A number that would round up to infinity keeps all its digits."""
    assert number_text(1.7976931348623157e308) == "1.7976931348623157e+308"


@given(finite)
def test_readers_take_every_number_for_a_float(value: float) -> None:
    """YAML 1.1 reads back a float within half a unit of the tenth digit."""
    back = yaml.safe_load(number_text(value))
    assert type(back) is float
    assert back == as_recorded(value)
    assert abs(back - value) <= 5.1e-10 * abs(value) or abs(value) < 1e-300


@given(finite)
def test_what_was_recorded_is_recorded_the_same(value: float) -> None:
    """A number that was read from a lock is written with the same characters."""
    assert number_text(as_recorded(value)) == number_text(value)


@given(finite)
def test_numbers_written_by_hand_keep_every_bit(value: float) -> None:
    """The plan's own numbers read back as the same double."""
    back = yaml.safe_load(exact_text(value))
    assert type(back) is float
    assert back == value
