from __future__ import annotations

from collections.abc import Callable
from typing import Any

import pytest

from beforehand.lock import Lock
from beforehand.screen.finding import key_finding
from beforehand.screen.planned import planned

LockOf = Callable[[dict[str, Any]], Lock]


def told(data: dict[str, Any], lock_of: LockOf) -> list[str]:
    """The key finding on lines as wide as prose may be."""
    lock = lock_of(data)
    assert lock.answer is not None
    return [line.strip() for line in key_finding(lock.answer, planned(lock), 100)]


def only(data: dict[str, Any], *names: str) -> dict[str, Any]:
    """The same lock with an answer of these predictors alone."""
    answer = data["answer"]
    answer["terms"] = [t for t in answer["terms"] if t["predictor"] in (None, *names)]
    answer["predictors"] = [p for p in answer["predictors"] if p["predictor"] in names]
    return data


def test_the_focal_predictor_comes_first_and_the_unclear_last(hives: dict[str, Any], lock_of: LockOf) -> None:
    """One sentence a predictor with units; the first says that the others are held fixed."""
    assert told(hives, lock_of) == [
        "honey goes up by 0.287 kg per season for each d of bloom_days, the other predictors held fixed.",
        "Against strain dark, honey is 3.9 kg per season higher with golden; no clear difference with grey.",
        "honey goes down by 0.211 kg per season for each unit of mites.",
        "honey goes down by 0.044 kg per season for each unit of the square of colony_age (in years).",
        "altitude: no clear relation (p 0.105).",
    ]


def test_a_single_predictor_has_no_others_to_hold_fixed(hives: dict[str, Any], lock_of: LockOf) -> None:
    """Nothing is held fixed in a model of one predictor."""
    assert told(only(hives, "bloom_days"), lock_of) == [
        "honey goes up by 0.287 kg per season for each d of bloom_days."
    ]


@pytest.mark.parametrize(
    ("transform", "exponent", "words"),
    [
        ("square", None, "the square of colony_age (in years)"),
        ("square_root", None, "the square root of colony_age (in years)"),
        ("log", None, "the natural logarithm of colony_age (in years)"),
        ("reciprocal", None, "the reciprocal of colony_age (in years)"),
        ("box_cox", 0.4, "colony_age under the Box-Cox power 0.400"),
    ],
)
def test_a_transformed_predictor_is_named_as_it_stands(
    transform: str, exponent: float | None, words: str, hives: dict[str, Any], lock_of: LockOf
) -> None:
    """A slope on a transformed scale never reads as one on the plain scale."""
    data = only(hives, "colony_age")
    data["answer"]["terms"][1].update(transform=transform, exponent=exponent)
    assert (
        " ".join(told(data, lock_of)) == f"honey goes down by 0.044 kg per season for each unit of {words}."
    )


def test_a_logarithmic_outcome_is_also_told_as_a_percentage(hives: dict[str, Any], lock_of: LockOf) -> None:
    """exp(0.0210) - 1 is 2.12 per cent."""
    data = only(hives, "bloom_days")
    data["answer"]["outcome"].update(transform="log", smearing=1.01)
    data["answer"]["terms"][1].update(coefficient=0.021, standard_error=0.004)
    assert told(data, lock_of) == [
        "The natural logarithm of honey goes up by 0.0210 for each d of bloom_days; honey itself goes up by",
        "2.12 %.",
    ]


def test_a_part_of_a_product_says_where_its_slope_holds(hives: dict[str, Any], lock_of: LockOf) -> None:
    """The slope of a part is that at the zero of its partner."""
    data = only(hives, "bloom_days")
    slope = data["answer"]["terms"][1]
    product = "bloom_days × altitude"
    data["answer"]["terms"].append(
        slope | {"term": product, "predictor": product, "coefficient": -0.0012, "standard_error": 0.0004,
                 "standardized": 0.1}
    )  # fmt: skip
    data["answer"]["predictors"].append(data["answer"]["predictors"][0] | {"predictor": product})
    assert told(data, lock_of) == [
        "honey goes up by 0.287 kg per season for each d of bloom_days where altitude is 0, the other",
        "predictors held fixed.",
        "honey goes down by 0.00120 kg per season for each unit of the product of bloom_days and altitude.",
    ]


def test_a_category_of_many_levels_is_told_by_its_ends(hives: dict[str, Any], lock_of: LockOf) -> None:
    """Beyond three clear levels the lowest and the highest are named."""
    data = only(hives, "strain")
    golden = data["answer"]["terms"][1]
    data["answer"]["terms"] = [
        golden | {"term": f"strain = s{place}", "level": f"s{place}", "coefficient": float(place - 2)}
        for place in range(5)
        if place != 2
    ]
    assert told(data, lock_of) == [
        "Against strain dark, honey is 2.0 kg per season lower with s0 and 2.0 kg per season higher with",
        "s4, the two ends of 4 levels.",
    ]


def test_a_category_that_does_not_show_says_so(hives: dict[str, Any], lock_of: LockOf) -> None:
    """The block's p decides, not that of one level."""
    data = only(hives, "strain")
    data["answer"]["predictors"][0]["p"] = 0.31
    assert told(data, lock_of) == ["strain: no clear difference between its levels (p 0.310)."]


def test_what_does_not_fit_on_a_screen_is_counted(hives: dict[str, Any], lock_of: LockOf) -> None:
    """Five sentences, then how many predictors are in the table only."""
    slope, whole = hives["answer"]["terms"][1], hives["answer"]["predictors"][0]
    for place in range(2):
        name = f"reading_{place}"
        hives["answer"]["terms"].append(slope | {"term": name, "predictor": name})
        hives["answer"]["predictors"].append(whole | {"predictor": name})
    lines = told(hives, lock_of)
    assert lines[-1] == "2 more predictors follow in the table."
