from __future__ import annotations

import pytest

from beforehand.screen import digits


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (0.0, "0"),
        (38.21034417, "38.2"),
        (412.7, "413"),
        (123456.7, "123457"),
        (0.00040119, "0.000401"),
        (0.0000401, "4.01e-05"),
        (-6.4123, "-6.41"),
        (3.1e9, "3.10e+09"),
        (None, "none"),
    ],
)
def test_figure_has_three_digits_and_never_rounds_whole_parts(value: float | None, text: str) -> None:
    """A plain number has three significant digits, more only where whole parts need them."""
    assert digits.figure(value) == text


@pytest.mark.parametrize(
    ("value", "text"), [(0.05, "0.05"), (1.0, "1"), (0.2, "0.2"), (120.0, "120"), (0.0, "0")]
)
def test_a_written_number_gets_no_zeros_that_were_not_written(value: float, text: str) -> None:
    """0.05 in a plan is 0.05 on the screen, not 0.0500."""
    assert digits.trimmed(value) == text


@pytest.mark.parametrize(
    ("values", "error", "texts"),
    [
        ((6.41234, 0.6123), 0.6123, ("6.41", "0.61")),
        ((38.2, 12.34), 12.34, ("38", "12")),
        ((1234.5, 123.4), 123.4, ("1234", "123")),
        ((-0.0031204, 0.0019133), 0.0019133, ("-0.0031", "0.0019")),
        ((1.2e-7, 2.0e-8), 2.0e-8, ("1.20e-07", "2.0e-08")),
        ((-0.001, 0.61), 0.61, ("0.00", "0.61")),
        ((2.0, None), None, ("2", "none")),
        ((1.0000000000000002, 1.2e-14), 1.2e-14, ("1.000000000", "1.2e-14")),
        ((9876543.21, 1e-5), 1e-5, ("9876543.210", "0.000")),
        ((3.1e9, 4.2e8), 4.2e8, ("3.10e+09", "4.2e+08")),
        ((0.441720, 0.0), 0.0, ("0.44172", "0")),
    ],
)
def test_a_coefficient_is_told_as_exactly_as_its_standard_error_allows(
    values: tuple[float | None, ...], error: float | None, texts: tuple[str, ...]
) -> None:
    """The standard error has two digits; all that stands beside it has its decimals."""
    assert digits.beside(values, error) == texts


@pytest.mark.parametrize(
    ("p", "limit", "text"),
    [
        (0.4126, None, "0.413"),
        (0.0004, 0.05, "<0.001"),
        (0.04996, 0.05, "0.050"),
        (0.05004, 0.05, "0.05004"),
        (0.05, 0.05, "0.050"),
        (0.0004, 0.001, "4.0e-04"),
        (None, 0.05, "none"),
    ],
)
def test_a_p_never_seems_to_stand_on_the_other_side_of_its_limit(
    p: float | None, limit: float | None, text: str
) -> None:
    """Three decimals, more where rounding would contradict the decision that was made on it."""
    assert digits.p_text(p, limit) == text


def test_a_p_in_a_sentence_has_no_sign_of_comparison() -> None:
    """Sentences say below, tables use the sign."""
    assert [digits.p_phrase(p) for p in (0.412, 0.0001, None)] == ["p 0.412", "p below 0.001", "no p"]


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (0.8123, "81.2 %"),
        (0.31, "31 %"),
        (0.0, "0 %"),
        (1.0, "100 %"),
        (0.99999, "more than 99.9 %"),
        (0.0001234, "0.0123 %"),
        (-2.2e-16, "0 %"),
        (-0.031, "-3.1 %"),
    ],
)
def test_a_share_that_is_not_all_never_reads_as_all(value: float, text: str) -> None:
    """0.99999 is not 100 %, and 0.0001 is not 0 %."""
    assert digits.percent(value) == text


def test_counts_and_lists_read_as_english() -> None:
    """Nouns agree with their number, long lists end in how many more there are."""
    assert [digits.count(n, "row") for n in (0, 1, 1200)] == ["0 rows", "1 row", "1,200 rows"]
    assert [digits.listed(n) for n in ([], ["a"], ["a", "b"], ["a", "b", "c"])] == [
        "",
        "a",
        "a and b",
        "a, b and c",
    ]
    assert digits.listed(["a", "b", "c", "d"], 2) == "a, b and 2 more"
