"""Parts of a plan that do not fit each other: each is a fault, said whole, in its place."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import pytest

from beforehand.plan import Plan
from beforehand.plan.consistency_of_rules import can_apply

X = {"column": "x"}
C = {"column": "c", "kind": "category", "levels": ["low", "high"]}

CASES: dict[str, tuple[dict[str, Any], list[str]]] = {
    "absolute file": (
        {"data": {"file": "/data/hives.csv"}},
        ["data.file: is not a path relative to the plan; a data file stands in the plan's own folder"],
    ),
    "file on a drive": (
        {"data": {"file": "C:\\hives.csv"}},
        ["data.file: is not a path relative to the plan; a data file stands in the plan's own folder"],
    ),
    "file by address": (
        {"data": {"file": "https://example.org/hives.csv"}},
        ["data.file: is not a path relative to the plan; a data file stands in the plan's own folder"],
    ),
    "file in another folder": (
        {"data": {"file": "sub/../../hives.csv"}},
        ["data.file: leaves the plan's folder; a data file stands inside it, so that both travel together"],
    ),
    "file in a folder below": ({"data": {"file": "tables/hives.csv"}}, []),
    "separator is the decimal mark": (
        {"data": {"file": "a.csv", "decimal": ","}},
        ["data.separator: is ',', which is also the decimal mark; set separator or decimal"],
    ),
    "separator of two signs": (
        {"data": {"file": "a.csv", "separator": "||"}},
        ["data.separator: is '||'; it must be one sign, such as , or ;"],
    ),
    "label is the outcome": (
        {"data": {"file": "a.csv", "row_label": "honey"}},
        ["data.row_label: is the outcome 'honey'; another column labels the rows"],
    ),
    "missing code twice": (
        {"data": {"file": "a.csv", "missing_codes": ["", "NA", ""]}},
        ["data.missing_codes[2]: names '' a second time"],
    ),
    "predictor twice": (
        {"predictors": [X, {"column": "z"}, X]},
        ["predictors[2].column: names 'x' a second time (first as predictors[0])"],
    ),
    "outcome as predictor": (
        {"predictors": [X, {"column": "honey"}]},
        ["predictors[1].column: is the outcome 'honey'; an outcome cannot predict itself"],
    ),
    "outcome behind a derived predictor": (
        {
            "derive": [{"column": "u", "from": "honey / x"}, {"column": "v", "from": "u + 1"}],
            "predictors": [X, {"column": "v"}],
        },
        ["predictors[1].column: is derived from the outcome 'honey'"],
    ),
    "outcome derived from a predictor": (
        {
            "derive": [{"column": "yield", "from": "honey / x"}],
            "outcome": {"column": "yield"},
            "predictors": [X],
        },
        [],
    ),
    "label as category": (
        {"data": {"file": "a.csv", "row_label": "c"}, "predictors": [C]},
        ["predictors[0].column: is the row label, so that every row would be a level of its own"],
    ),
    "category without levels": (
        {"predictors": [{"column": "c", "kind": "category"}]},
        ["predictors[0].levels: is missing; the category 'c' needs its levels, such as [low, high]"],
    ),
    "category with one level": (
        {"predictors": [C | {"levels": ["low"]}]},
        ["predictors[0].levels: has one level, 'low'; a category needs two or more"],
    ),
    "level twice": (
        {"predictors": [C | {"levels": ["low", "high", "low"]}]},
        ["predictors[0].levels[2]: names 'low' a second time"],
    ),
    "level that is missing": (
        {"predictors": [C | {"levels": ["low", "NA"]}]},
        ["predictors[0].levels[1]: is 'NA', which data.missing_codes reads as missing"],
    ),
    "baseline that is no level": (
        {"predictors": [C | {"baseline": "lo"}]},
        ["predictors[0].baseline: is 'lo', which is not among the levels low, high (nearest: 'low')"],
    ),
    "levels of a number": (
        {"predictors": [{"column": "x", "levels": ["a", "b"], "baseline": "a"}]},
        [
            "predictors[0].levels: belongs to a category, but 'x' is a number; add kind: category",
            "predictors[0].baseline: belongs to a category, but 'x' is a number; add kind: category",
        ],
    ),
    "range of a category": (
        {"predictors": [C | {"range": [0, 1]}]},
        ["predictors[0].range: belongs to a number, but 'c' is a category"],
    ),
    "range upside down": (
        {"predictors": [X | {"range": [5, 1]}]},
        ["predictors[0].range: runs from 5 to 1; the lower end comes first"],
    ),
    "range of nothing": (
        {"predictors": [X | {"range": [None, None]}]},
        ["predictors[0].range: has no end that binds; leave it out"],
    ),
    "range with one end": ({"predictors": [X | {"range": [0, None]}]}, []),
    "derived category": (
        {"derive": [{"column": "c", "from": "a + b"}], "predictors": [C]},
        ["predictors[0].kind: is category, but a derived column holds numbers"],
    ),
    "derived twice": (
        {"derive": [{"column": "u", "from": "a"}, {"column": "u", "from": "b"}]},
        ["derive[1].column: makes 'u' a second time (first as derive[0])"],
    ),
    "derived from itself": (
        {"derive": [{"column": "u", "from": "u + 1"}]},
        ["derive[0].from: uses 'u' to make 'u'; choose a new name"],
    ),
    "derived from a later one": (
        {"derive": [{"column": "u", "from": "v + 1"}, {"column": "v", "from": "u + 1"}]},
        ["derive[0].from: uses 'v', which is made only later (derive[1]); put that line first"],
    ),
    "derived from a category": (
        {"derive": [{"column": "u", "from": "breed * 2"}]},
        ["derive[0].from: computes with 'breed', which is a category"],
    ),
    "derived over the label": (
        {"data": {"file": "a.csv", "row_label": "u"}, "derive": [{"column": "u", "from": "a + 1"}]},
        ["derive[0].column: is the row label, which stands in the file"],
    ),
    "derived from an earlier one": (
        {"derive": [{"column": "u", "from": "a + 1"}, {"column": "v", "from": "u * u"}]},
        [],
    ),
    "rows chosen by the outcome": (
        {"eligibility": [{"column": "honey", "above": 0, "because": "b"}]},
        [
            "eligibility[0].column: chooses rows by the outcome 'honey', which is not to be looked at; "
            "outcome.range says which values are possible"
        ],
    ),
    "rows chosen twice": (
        {
            "eligibility": [
                {"column": "a", "is": "u", "because": "b"},
                {"column": "a", "is": "u", "because": "c"},
            ]
        },
        ["eligibility[1]: asks the same as eligibility[0]"],
    ),
    "rows of an undeclared level": (
        {"eligibility": [{"column": "breed", "one_of": ["dark", "yelow"], "because": "b"}]},
        [
            "eligibility[0].one_of: asks for 'yelow', which is not among the "
            "levels of 'breed' (nearest: 'yellow')"
        ],
    ),
    "rows of a numeric level": (
        {
            "predictors": [{"column": "grade", "kind": "category", "levels": ["1", "2"]}],
            "eligibility": [{"column": "grade", "is": 1, "because": "b"}],
        },
        [],
    ),
    "rows without a level": (
        {"eligibility": [{"column": "breed", "is_not": "unknown", "because": "b"}]},
        [],
    ),
    "product of an unknown predictor": (
        {"products": [["bloom", "rian"]]},
        ["products[0][1]: names 'rian', which is not among the predictors (nearest: 'rain')"],
    ),
    "product of one": (
        {"products": [["bloom", "bloom"]]},
        ["products[0]: multiplies 'bloom' by itself; for a curve, transforms.try has square"],
    ),
    "product twice": (
        {"products": [["bloom", "rain"], ["rain", "bloom"]]},
        ["products[1]: names the product of products[0] again"],
    ),
    "unknown predictor kept": (
        {"keep": [{"predictor": "blom", "rule": "always", "because": "b"}]},
        ["keep[0].predictor: names 'blom', which is not among the predictors (nearest: 'bloom')"],
    ),
    "outcome kept": (
        {"keep": [{"predictor": "honey", "rule": "always", "because": "b"}]},
        ["keep[0].predictor: names the outcome 'honey'; rules keep predictors"],
    ),
    "kept twice": (
        {
            "keep": [
                {"predictor": "rain", "rule": "always", "because": "b"},
                {"at_least_one_of": ["bloom", "breed"], "because": "b"},
                {"predictor": "rain", "rule": {"unless_p_above": 0.2}, "because": "b"},
            ]
        },
        ["keep[2].predictor: has a second rule for 'rain' (first in keep[0])"],
    ),
    "product kept that is none": (
        {"keep": [{"predictor": ["bloom", "rain"], "rule": "always", "because": "b"}]},
        ["keep[0].predictor: names the product [bloom, rain], which is not among the products"],
    ),
    "product kept the other way round": (
        {
            "products": [["bloom", "rain"]],
            "keep": [{"predictor": ["rain", "bloom"], "rule": "always", "because": "b"}],
        },
        ["keep[0].predictor: names [rain, bloom]; products has it as [bloom, rain]"],
    ),
    "sign of a category": (
        {"keep": [{"predictor": "breed", "rule": "always", "because": "b", "expected_sign": "positive"}]},
        [
            "keep[0].expected_sign: expects a sign of 'breed', a category, which "
            "has a coefficient for each level"
        ],
    ),
    "group of an unknown predictor": (
        {"keep": [{"at_least_one_of": ["rain", "sunn"], "because": "b"}]},
        ["keep[0].at_least_one_of[1]: names 'sunn', which is not among the predictors"],
    ),
    "group of one": (
        {"keep": [{"at_least_one_of": ["rain"], "because": "b"}]},
        ["keep[0].at_least_one_of: has one entry; it must have at least 2 entries"],
    ),
    "group with a name twice": (
        {"keep": [{"at_least_one_of": ["rain", "bloom", "rain"], "because": "b"}]},
        ["keep[0].at_least_one_of[2]: names 'rain' a second time"],
    ),
    "group beside an always rule": (
        {
            "keep": [
                {"at_least_one_of": ["rain", "bloom"], "because": "b"},
                {"predictor": "bloom", "rule": "always", "because": "b"},
            ]
        },
        ["keep[0].at_least_one_of: is idle: keep[1] always keeps 'bloom', so one of the group always stays"],
    ),
    "group beside a product that always stays": (
        {
            "products": [["bloom", "rain"]],
            "keep": [
                {"predictor": ["bloom", "rain"], "rule": "always", "because": "b"},
                {"at_least_one_of": ["rain", "breed"], "because": "b"},
            ],
        },
        ["keep[1].at_least_one_of: is idle: keep[0] always keeps 'rain', so one of the group always stays"],
    ),
    "group beside a rule with a bound": (
        {
            "keep": [
                {"at_least_one_of": ["rain", "bloom"], "because": "b"},
                {"predictor": "bloom", "rule": {"unless_p_above": 0.2}, "because": "b"},
            ]
        },
        [],
    ),
    "group around a group": (
        {
            "keep": [
                {"at_least_one_of": ["rain", "bloom", "breed"], "because": "b"},
                {"at_least_one_of": ["rain", "bloom"], "because": "b"},
            ]
        },
        ["keep[0].at_least_one_of: is idle: keep[1] keeps one of rain, bloom already"],
    ),
    "group twice": (
        {
            "keep": [
                {"at_least_one_of": ["rain", "bloom"], "because": "b"},
                {"at_least_one_of": ["bloom", "rain"], "because": "c"},
            ]
        },
        ["keep[1].at_least_one_of: is idle: keep[0] keeps one of rain, bloom already"],
    ),
    "fill of an unknown predictor": (
        {"missing_data": {"fill": {"rainn": "mean"}}},
        ["missing_data.fill.rainn: names 'rainn', which is not among the predictors (nearest: 'rain')"],
    ),
    "fill of the outcome": (
        {"missing_data": {"fill": {"honey": "mean"}}},
        ["missing_data.fill.honey: fills the outcome; rows without an outcome leave"],
    ),
    "mean of a category": (
        {"missing_data": {"fill": {"breed": "mean"}}},
        [
            "missing_data.fill.breed: is mean, but 'breed' is a category; "
            "it can be filled with most_common or a level"
        ],
    ),
    "most common level": ({"missing_data": {"fill": {"breed": "most_common", "rain": "most_common"}}}, []),
    "value that is no level": (
        {"missing_data": {"fill": {"breed": {"value": "drak"}}}},
        [
            "missing_data.fill.breed.value: is 'drak', which is not among the "
            "levels of 'breed' (nearest: 'dark')"
        ],
    ),
    "level without quotes": (
        {
            "predictors": [{"column": "grade", "kind": "category", "levels": ["1", "2"]}],
            "missing_data": {"fill": {"grade": {"value": 1}}},
        },
        [
            "missing_data.fill.grade.value: is '1', which is not among the levels "
            "of 'grade'; write '1' in quotes"
        ],
    ),
    "text for a number": (
        {"missing_data": {"fill": {"rain": {"value": "none"}}}},
        ["missing_data.fill.rain.value: is 'none', but 'rain' is a number"],
    ),
    "value out of range": (
        {"missing_data": {"fill": {"bloom": {"value": 121}}}},
        ["missing_data.fill.bloom.value: is 121, outside the range of 'bloom'"],
    ),
    "outcome ladder": (
        {"outcome": {"column": "honey", "range": [0, 90], "transforms": ["square_root", "log"]}},
        ["outcome.transforms[1]: lets 'honey' run from 0 to 90, but log needs numbers above 0"],
    ),
    "outcome ladder twice": (
        {"outcome": {"column": "honey", "transforms": ["log", "log"]}},
        ["outcome.transforms[1]: names 'log' a second time"],
    ),
    "log of a range that reaches 0": (
        {"transforms": {"try": ["log"]}},
        ["predictors[0].range: lets 'bloom' run from 0 to 120, but log needs numbers above 0"],
    ),
    "ladder without a rung for a range": (
        {
            "predictors": [X | {"range": [-1, 1]}, {"column": "z"}],
            "transforms": {"try": ["square_root", "log"]},
        },
        [
            "predictors[0].range: lets 'x' run from -1 to 1, but square_root needs numbers not below 0, "
            "and no other rung in transforms.try can either"
        ],
    ),
    "rung for no range": (
        {"predictors": [X | {"range": [-1, 1]}], "transforms": {"try": ["cube", "reciprocal"]}},
        [
            "transforms.try[1]: is reciprocal, which needs numbers other than 0; "
            "no predictor's declared range has only such"
        ],
    ),
    "rung that one predictor cannot take": ({"transforms": {"try": ["square", "log"]}}, []),
    "ladder that is not called": ({"transforms": {"try": ["log"], "when": []}}, []),
    "ladder of a plan without the step": ({"transforms": {"try": ["log"]}, "steps": ["selection"]}, []),
    "rung twice": (
        {"transforms": {"try": ["square", "cube", "square"]}},
        ["transforms.try[2]: names 'square' a second time"],
    ),
    "adjustment of nothing": (
        {"predictors": [X], "multiplicity": "holm"},
        ["multiplicity: is holm, but no predictor has role: focal, so there is nothing to adjust"],
    ),
    "step twice": (
        {"steps": ["influence", "selection", "influence"]},
        ["steps[2]: takes the step influence a second time"],
    ),
    "missing_data late": (
        {"steps": ["selection", "missing_data"]},
        ["steps[1]: has missing_data after selection; it comes first"],
    ),
    "final_checks early": (
        {"steps": ["final_checks", "selection"]},
        ["steps[0]: has final_checks before selection; it comes last"],
    ),
    "steps in another lawful order": (
        {"steps": ["missing_data", "influence", "collinearity", "transforms", "selection", "final_checks"]},
        [],
    ),
    "no steps": ({"steps": []}, []),
    "statistic without bounds": (
        {"assumptions": {"independence": {"test": "durbin_watson", "in_order_of": "day"}}},
        [
            "assumptions.independence.between: is missing; durbin_watson has no p value, "
            "so say where it must lie, such as [1.5, 2.5]"
        ],
    ),
    "bounds without the statistic": (
        {"assumptions": {"independence": {"between": [1.5, 2.5]}}},
        [
            "assumptions.independence.between: has no meaning for breusch_godfrey, "
            "which is judged by its p; leave it out"
        ],
    ),
    "bounds beyond the statistic": (
        {"assumptions": {"independence": {"test": "durbin_watson", "between": [1.5, 4.5], "lags": 2}}},
        [
            "assumptions.independence.lags: has no meaning for durbin_watson, which looks one row back",
            "assumptions.independence.between: reaches beyond 0 to 4, where the statistic always lies",
        ],
    ),
    "order by the outcome": (
        {"assumptions": {"independence": {"in_order_of": "honey"}}},
        ["assumptions.independence.in_order_of: is the outcome 'honey'; another column orders the rows"],
    ),
    "clusters by the outcome": (
        {"errors": {"cluster_by": "honey"}},
        ["errors.cluster_by: is the outcome 'honey'; another column names the clusters"],
    ),
    "lags without an order": (
        {"errors": {"autocorrelation_lags": 7}},
        [
            "errors.autocorrelation_lags: needs an order of the rows; "
            "name its column in assumptions.independence.in_order_of"
        ],
    ),
    "slope of an unknown predictor": (
        {"expects": {"residual_sd": 1, "slopes": {"bloom": 1, "rian": 2}}},
        ["expects.slopes.rian: names 'rian', which is not among the predictors (nearest: 'rain')"],
    ),
    "slope of a category": (
        {"expects": {"residual_sd": 1, "slopes": {"breed": 1}}},
        [
            "expects.slopes.breed: gives a slope to 'breed', which is a category; "
            "give its levels their differences from 'dark', {level: number}"
        ],
    ),
    "slopes of levels": ({"expects": {"residual_sd": 1, "slopes": {"breed": {"yellow": -2.5}}}}, []),
    "slopes of other levels": (
        {"expects": {"residual_sd": 1, "slopes": {"breed": {"dark": 1, "yelow": 2}, "bloom": {"dark": 1}}}},
        [
            "expects.slopes.bloom: gives levels to 'bloom', which is a number",
            "expects.slopes.breed.dark: is 1, but 'dark' is the baseline that the others differ from",
            "expects.slopes.breed.yelow: names 'yelow', which is not among the levels of 'breed' "
            "(nearest: 'yellow')",
        ],
    ),
    "slope that is neither": (
        {"expects": {"residual_sd": 1, "slopes": {"breed": {"yellow": "much"}, "bloom": [1], "rain": {}}}},
        [
            "expects.slopes.breed: gives 'yellow' 'much'; it must be a number",
            "expects.slopes.bloom: is a list; "
            "it must be a number, or of a category numbers by level, {level: number}",
            "expects.slopes.rain: names no level; give each level its difference from the baseline",
        ],
    ),
    "correlations of what is not a number": (
        {
            "expects": {
                "residual_sd": 1,
                "correlations": [
                    {"between": ["bloom", "rian"], "r": 0.5},
                    {"between": ["rain", "breed"], "r": 0.5},
                    {"between": ["rain", "rain"], "r": 0.5},
                ],
            }
        },
        [
            "expects.correlations[0].between[1]: names 'rian', which is not among the predictors "
            "(nearest: 'rain')",
            "expects.correlations[1].between[1]: names 'breed', a category; correlations are of numbers",
            "expects.correlations[2].between: names 'rain' twice; a correlation is of two",
        ],
    ),
    "correlation named twice": (
        {
            "expects": {
                "residual_sd": 1,
                "correlations": [
                    {"between": ["bloom", "rain"], "r": 0.5},
                    {"between": ["rain", "bloom"], "r": 0.4},
                ],
            }
        },
        ["expects.correlations[1]: names the pair of expects.correlations[0] again"],
    ),
    "correlation of 1": (
        {"expects": {"residual_sd": 1, "correlations": [{"between": ["bloom", "rain"], "r": 1}]}},
        ["expects.correlations[0].r: is 1; it must lie between -1 and 1, both excluded"],
    ),
    "correlations that cannot hold together": (
        {
            "predictors": [X, {"column": "z"}, {"column": "w"}],
            "expects": {
                "residual_sd": 1,
                "correlations": [{"between": ["x", "z"], "r": 0.8}, {"between": ["z", "w"], "r": 0.8}],
            },
        },
        [
            "expects.correlations: cannot all hold at once: "
            "with 0 for the other pairs, the matrix is not positive definite"
        ],
    ),
    "groups of the outcome": (
        {"rehearsal": {"leave_out": "honey"}},
        ["rehearsal.leave_out: is the outcome 'honey'; another column names the groups"],
    ),
    "one fold": (
        {"rehearsal": {"folds": 1}},
        ["rehearsal.folds: is 1; it must lie between 2 and 1000"],
    ),
    "expected shares": (
        {
            "expects": {
                "residual_sd": 1,
                "predictors": {
                    "breed": {"mean": 1, "shares": {"dark": 0.5, "yelow": 0.2}},
                    "rain": {"shares": {"u": 1}},
                    "sun": {"mean": 1},
                },
            }
        },
        [
            "expects.predictors.breed.mean: belongs to a number, but 'breed' is a category",
            "expects.predictors.breed.shares.yelow: names 'yelow', which is not among the levels of 'breed' "
            "(nearest: 'yellow')",
            "expects.predictors.breed.shares: add up to 0.7; shares add up to 1",
            "expects.predictors.rain.shares: belongs to a category, but 'rain' is a number",
            "expects.predictors.sun: names 'sun', which is not among the predictors",
        ],
    ),
    "smallest effect": (
        {"outcome": {"column": "honey", "smallest_effect_that_matters": 0}},
        ["outcome.smallest_effect_that_matters: is 0; it must be above 0"],
    ),
    "no predictors": ({"predictors": []}, ["predictors: has no entry; it must have at least one entry"]),
    "weights": (
        {"weights": "w", "hold_out": {"share": "20%", "seed": 3}},
        [
            "weights: is kept for a later version of the plan language (weighted rows); "
            "this one cannot do it",
            "hold_out: is kept for a later version of the plan language (rows held out for a test); "
            "this one cannot do it",
        ],
    ),
    "imputation": (
        {"missing_data": {"fill": {"rain": {"impute": 20, "seed": 7}, "bloom": "mean"}}},
        [
            "missing_data.fill.rain.impute: is kept for a later version of the plan language "
            "(multiple imputation); this one cannot do it"
        ],
    ),
}


@pytest.mark.parametrize("case", CASES)
def test_case(case: str, faults_with: Callable[..., list[str]]) -> None:
    """Each case has exactly the faults that are listed beside it, and no other."""
    blocks, expected = CASES[case]
    assert faults_with(**blocks) == expected


@pytest.mark.parametrize(
    ("rung", "bounds", "applies"),
    [
        ("log", None, True),
        ("log", (0.0, 1.0), False),
        ("log", (0.1, None), True),
        ("log", (None, 5.0), True),
        ("log", (None, 0.0), False),
        ("log", (-1.0, None), False),
        ("box_cox", (0.0, 1.0), False),
        ("reciprocal", (0.0, 1.0), False),
        ("reciprocal", (-1.0, 1.0), False),
        ("reciprocal", (-2.0, -1.0), True),
        ("reciprocal", (1.0, 2.0), True),
        ("reciprocal", (None, 0.0), False),
        ("reciprocal", (-1.0, None), False),
        ("reciprocal", (None, 1.0), True),
        ("square_root", (0.0, 1.0), True),
        ("square_root", (-1.0, 1.0), False),
        ("square_root", (None, -1.0), False),
        ("cube_root", (-1.0, 1.0), True),
        ("square", (-1.0, 1.0), True),
        ("cube", (-1.0, 1.0), True),
    ],
)
def test_rungs_and_ranges(rung: str, bounds: tuple[float | None, float | None] | None, applies: bool) -> None:
    """A rung applies to a range when it is defined on all of it that is declared."""
    assert can_apply(rung, bounds) is applies


def test_the_large_plan_is_right(large: Plan) -> None:
    """A plan that uses every block has no fault."""
    assert large.alpha == 0.05
