from __future__ import annotations

from collections.abc import Callable
from typing import Any

from beforehand.lock import Lock
from beforehand.screen.coefficients import coefficient_lines, coefficient_scale
from beforehand.screen.planned import planned

LockOf = Callable[[dict[str, Any]], Lock]


def lines_of(data: dict[str, Any], lock_of: LockOf, width: int) -> tuple[str, ...]:
    """The table of a lock."""
    lock = lock_of(data)
    assert lock.answer is not None
    return coefficient_lines(lock.answer, planned(lock), width)


def test_the_table_has_our_labels_and_the_intercept_last(hives: dict[str, Any], lock_of: LockOf) -> None:
    """Every term with its numbers, as exact as its standard error, and its unit."""
    # The lines are cut after the interval, so that they fit here; the last column follows.
    lines = lines_of(hives, lock_of, 120)
    assert [line[:92].rstrip() for line in lines] == [
        "                       Coefficient   Standard error       t        p        95 % interval",
        "  bloom_days                0.287            0.033     8.68   <0.001    0.222  to  0.353",
        "  altitude                 -0.0031           0.0019   -1.63    0.105   -0.0069 to  0.0007",
        "  colony_age, square       -0.044            0.012    -3.67   <0.001   -0.068  to -0.020",
        "  mites                    -0.211            0.058    -3.66   <0.001   -0.325  to -0.097",
        "  strain: golden            3.9              1.0       3.79   <0.001    1.9    to  5.9",
        "  strain: grey             -0.4              1.1      -0.40    0.691   -2.6    to  1.7",
        "  intercept                 6.4              2.9       2.20    0.029    0.7    to 12.2",
    ]
    assert [line[92:] for line in lines] == [
        "Per",
        "d",
        "m",
        "years²",
        "unit",
        "against dark",
        "against dark",
        "",
    ]


def test_the_level_of_the_interval_is_that_of_the_plan(hives: dict[str, Any], lock_of: LockOf) -> None:
    """An alpha of 0.01 makes 99 % intervals."""
    hives["plan"]["written"]["alpha"] = 0.01
    assert "99 % interval" in lines_of(hives, lock_of, 120)[0]


def test_units_move_beneath_a_tight_table(hives: dict[str, Any], lock_of: LockOf) -> None:
    """No unit is lost when its column has no room."""
    assert lines_of(hives, lock_of, 80)[-2:] == (
        "  Per: bloom_days d; altitude m; colony_age, square years²; strain: golden",
        "  against dark; strain: grey against dark.",
    )


def test_a_narrow_screen_gets_a_list(hives: dict[str, Any], lock_of: LockOf) -> None:
    """At 60 cells each term has its own lines, with the same labels."""
    assert lines_of(hives, lock_of, 60)[:3] == (
        "  bloom_days, per d",
        "    Coefficient 0.287  Standard error 0.033  t 8.68",
        "    p <0.001  95 % interval 0.222 to 0.353",
    )


def test_an_exact_fit_has_coefficients_only(hives: dict[str, Any], lock_of: LockOf) -> None:
    """What does not exist has no column, and a sentence says why."""
    for term in hives["answer"]["terms"]:
        term.update(standard_error=0.0, t=None, p=None)
    lines = lines_of(hives, lock_of, 100)
    assert lines[0] == "                       Coefficient   Per"
    assert lines[-1] == (
        "  The model fits without residuals, so there is no standard error, t, p or interval."
    )


def test_a_product_of_transformed_parts_claims_no_plain_unit(hives: dict[str, Any], lock_of: LockOf) -> None:
    """Its parts enter as they stand in the model, so their plain units would mislead."""
    product = "bloom_days × altitude"
    term = hives["answer"]["terms"][1] | {"term": product, "predictor": product, "transform": None}
    hives["answer"]["terms"].append(term)
    assert lines_of(hives, lock_of, 120)[-2].split("   ")[-1].strip() == "d × m"
    term["transform"] = "square"
    assert lines_of(hives, lock_of, 120)[-2].split("   ")[-1].strip() == "as transformed"


def test_adjusted_p_stands_beside_the_plain_one(hives: dict[str, Any], lock_of: LockOf) -> None:
    """A column of its own, empty for predictors that are not focal."""
    hives["answer"]["terms"][1]["adjusted_p"] = 0.0204
    lines = lines_of(hives, lock_of, 140)
    assert "p   p adjusted" in lines[0]
    assert "<0.001        0.020" in lines[1]


def test_the_heading_says_which_standard_errors_stand_in_the_table(
    hives: dict[str, Any], lock_of: LockOf
) -> None:
    """Robust errors are named; classical ones need no word."""
    lock = lock_of(hives)
    assert lock.answer is not None
    assert coefficient_scale(lock.answer, planned(lock)) == "in kg per season per unit of each predictor"
    hives["answer"]["errors"] = "hc3"
    lock = lock_of(hives)
    assert lock.answer is not None
    assert coefficient_scale(lock.answer, planned(lock)) == (
        "in kg per season per unit of each predictor; standard errors robust to uneven spread (HC3)"
    )
