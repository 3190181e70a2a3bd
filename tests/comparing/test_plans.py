from __future__ import annotations

import copy
import itertools
import random
import time
from typing import Any

import pytest

from beforehand.comparing import plan_changes
from beforehand.plan import (
    canonical_text,
    decisions_digest,
    plan_from_mapping,
    plan_from_text,
    whole_digest,
)

Data = dict[str, Any]


def at(path: str, value: object):
    """An edit that writes a value at a place: ``predictors.0.range``."""

    def edit(data: Data) -> None:
        *outer, last = path.split(".")
        inner: Any = data
        for step in outer:
            inner = inner[int(step)] if isinstance(inner, list) else inner.setdefault(step, {})
        inner[int(last) if isinstance(inner, list) else last] = value

    return edit


def added(path: str, item: object):
    """An edit that adds an item to a list."""
    return lambda data: data.setdefault(path, []).append(item)


def gone(path: str, position: int):
    """An edit that takes an item out of a list."""
    return lambda data: data[path].pop(position)


def turned(path: str):
    """An edit that turns a list round."""
    return lambda data: data[path].reverse()


# An edit of the pump's plan, and every sentence that follows.
SENTENCES: list[tuple[Any, list[str]]] = [
    (at("alpha", 0.1), ["alpha from 0.05 to 0.10: predictors pass more easily: looser."]),
    (at("alpha", 0.02), ["alpha from 0.05 to 0.02: predictors pass less easily: stricter."]),
    (
        at("title", "Power of two pumps"),
        ["title from Power of a pump to Power of two pumps: no number and no ruling depends on it: wording."],
    ),
    (
        at("data.file", "pump-2.csv"),
        ["data.file from pump.csv to pump-2.csv: another file is read: different."],
    ),
    (
        at("data.missing_codes", ["", "NA", "-", "99"]),
        ['data.missing_codes gains "99": more cells may be set aside as missing: looser.'],
    ),
    (
        at("data.missing_codes", ["-", "NA", ""]),
        ['data.missing_codes from ["", NA, -] to [-, NA, ""]: their order means nothing: wording.'],
    ),
    (
        at("data.labels_in_lock", "hashed"),
        ["data.labels_in_lock from shown to hashed: only how the lock shows labels: wording."],
    ),
    (
        at("eligibility.0.is", "trial"),
        [
            "eligibility[phase].is from in use to trial: "
            "another population is meant, not another standard: different."
        ],
    ),
    (
        at("eligibility.2.at_most", 20),
        [
            "eligibility[hour at_most].at_most from 22 to 20: "
            "another population is meant, not another standard: different."
        ],
    ),
    (
        gone("eligibility", 2),
        ["eligibility[hour at_most] is gone: more rows may be the population: different."],
    ),
    (
        turned("eligibility"),
        ["eligibility stand in another order: the record counts the rows in this order: different."],
    ),
    (
        at("derive.0.from", "pressure * 9"),
        ["derive[lift].from from pressure * 10 to pressure * 9: the column holds other values: different."],
    ),
    (
        at("outcome.unit", "W"),
        ["outcome.unit from kW to W: no number and no ruling depends on it: wording."],
    ),
    (
        at("outcome.range", [0, 500]),
        ["outcome.range from [0, 400] to [0, 500]: more values are accepted: looser."],
    ),
    (
        at("predictors.0.range", [10, 300]),
        [
            "predictors[flow].range from [0, 200] to [10, 300]: more values are accepted: looser.",
            "predictors[flow].range from [0, 200] to [10, 300]: fewer values are accepted: stricter.",
        ],
    ),
    (
        at("predictors.0.role", "candidate"),
        ["predictors[flow].role from focal to candidate: the question puts it in another place: different."],
    ),
    (
        added("predictors", {"column": "heat"}),
        ["predictors[heat] is new: one more predictor is in the question: different."],
    ),
    (
        lambda data: data["predictors"].insert(0, data["predictors"].pop(2)),
        ["predictors stand in another order: ties go to the earlier predictor: different."],
    ),
    (
        at("predictors.3.levels", ["east", "north", "west"]),
        [
            "predictors[site].levels from [east, west, north] to [east, north, west]: "
            "levels stand in the model in this order: different."
        ],
    ),
    (
        at("predictors.3.baseline", "west"),
        ["predictors[site].baseline from east to west: levels are compared with another one: different."],
    ),
    (gone("products", 0), ["products[flow, lift] is gone: a product is no longer in the model: different."]),
    (
        at("products.0", ["lift", "flow"]),
        [
            "products[lift, flow] from [flow, lift] to [lift, flow]: "
            "its two predictors stand the other way round: different."
        ],
    ),
    (gone("keep", 0), ["keep[flow] is gone: it must now pass like any other: stricter."]),
    (
        at("keep.2", {"predictor": ["flow", "lift"], "rule": "always", "because": "Both."}),
        [
            "keep[lift, site] is gone: it must now pass like any other: stricter.",
            "keep[flow, lift] is new: something may stay without passing: looser.",
        ],
    ),
    (
        at("keep.1.rule", "always"),
        ["keep[age].rule from {unless_p_above: 0.2} to always: it stays whatever its p: looser."],
    ),
    (
        at("keep.1.rule", {"unless_p_above": 0.15}),
        ["keep[age].rule.unless_p_above from 0.20 to 0.15: it leaves with a smaller p: stricter."],
    ),
    (
        at("keep.0.expected_sign", "negative"),
        ["keep[flow].expected_sign from positive to negative: the other sign is expected: different."],
    ),
    (
        lambda data: data["keep"][0].pop("expected_sign"),
        ["keep[flow].expected_sign from positive to none: no sign is expected any longer: looser."],
    ),
    (
        at("keep.2.at_least_one_of", ["age", "site", "lift"]),
        [
            "keep[age, site, lift].at_least_one_of gains age: another group is protected: different.",
            "keep[age, site, lift].at_least_one_of from [lift, site] to [age, site, lift]: "
            "their order means nothing: wording.",
        ],
    ),
    (
        at("keep.0.because", "Work is done."),
        [
            "keep[flow].because from Work done. to Work is done.: "
            "no number and no ruling depends on it: wording."
        ],
    ),
    (
        at("multiplicity", "holm"),
        ["multiplicity from none to holm: several focal predictors pass less easily: stricter."],
    ),
    (at("intercept", False), ["intercept from true to false: another form of model is fitted: different."]),
    (
        at("steps", ["missing_data", "collinearity", "influence", "selection", "final_checks"]),
        ["steps loses transforms: a step is no longer taken: different."],
    ),
    (
        at("missing_data.remove_predictor_above", "50%"),
        ["missing_data.remove_predictor_above from 0.4 to 0.5: emptier predictors stay: looser."],
    ),
    (
        at("missing_data.fill", {"age": "median"}),
        ["missing_data.fill.age is new, median: made-up cells count as observed: looser."],
    ),
    (
        at("missing_data.out_of_range", "missing"),
        ["missing_data.out_of_range from fault to missing: impossible values pass as missing: looser."],
    ),
    (
        at("assumptions.curvature", "skip"),
        ["assumptions.curvature from {alpha: 0.01} to skip: the check is no longer made: looser."],
    ),
    (
        at("assumptions.curvature", {"alpha": 0.05}),
        ["assumptions.curvature.alpha from 0.01 to 0.05: the check fails more readily: stricter."],
    ),
    (
        at("transforms.try", ["square", "cube", "log"]),
        [
            "transforms.try loses square_root: fewer forms may be tried until one passes: stricter.",
            "transforms.try gains log: one more form may be tried until one passes: looser.",
        ],
    ),
    (
        at("transforms.if_none_works", "remove_predictor"),
        ["transforms.if_none_works from keep_as_is to remove_predictor: a bent predictor leaves: stricter."],
    ),
    (
        at("collinearity.examine_when", {"vif_above": 10}),
        [
            "collinearity.examine_when.vif_above from 5 to 10: "
            "fewer pairs that say the same are examined: looser."
        ],
    ),
    (
        at("influence.flag_when", {"cooks_distance": "8/n"}),
        [
            "influence.flag_when.cooks_distance from 4/n to 8/n: "
            "fewer rows are flagged and may leave: stricter."
        ],
    ),
    (at("influence.at_most", "10%"), ["influence.at_most from 0.05 to 0.10: more rows may leave: looser."]),
    (
        at("influence.remove_when", {"coefficient": 1, "sign_changes": True}),
        ["influence.remove_when.sign_changes from false to true: one more reason removes a row: looser."],
    ),
    (
        at("selection.method", "backward_aic"),
        ["selection.method from backward to backward_aic: predictors are chosen in another way: different."],
    ),
    (
        at("final_checks.if_curved", "stop"),
        ["final_checks.if_curved from report to stop: a failed check has more weight: stricter."],
    ),
    (
        at("errors", "hc3"),
        ["errors from classical to hc3: standard errors are computed otherwise: different."],
    ),
    (
        at("errors", {"cluster_by": "plant"}),
        ["errors from classical to {cluster_by: plant}: standard errors are computed otherwise: different."],
    ),
    (
        lambda data: data.pop("expects"),
        ["expects is gone: rehearsal supposes another world; the run is not touched: different."],
    ),
    (
        at("expects.slopes", {"flow": 2}),
        [
            "expects.slopes.flow from 1.5 to 2.0: "
            "rehearsal supposes another world; the run is not touched: different."
        ],
    ),
    (
        at("rehearsal.replicates", 500),
        ["rehearsal.replicates from 2000 to 500: the plan is rehearsed less often: looser."],
    ),
    (
        at("alternatives.robust", {"errors": "hc3"}),
        ["alternatives.robust is new, {errors: hc3}: the answer is held against one more plan: stricter."],
    ),
    (
        at("alternatives.stricter", {"alpha": 0.02}),
        [
            "alternatives.stricter from {alpha: 0.01} to {alpha: 0.02}: "
            "the answer is held against another plan: different."
        ],
    ),
    (
        at("alternatives.stricter", {"alpha": "1%", "purpose": "explain"}),
        [
            "alternatives.stricter from {alpha: 0.01} to {alpha: 0.01, purpose: explain}: "
            "it leads to the same plan: wording."
        ],
    ),
    (
        at("refresh", {"rulings": "any"}),
        ["refresh.rulings from same to any: an answer holds whatever the verdicts: looser."],
    ),
    (
        at(
            "amendments",
            [
                {
                    "date": "2026-12-01",
                    "why": "A gap.",
                    "kind": "gap",
                    "seen": "nothing",
                    "expected_effect": "None.",
                }
            ],
        ),
        ["amendments[0] is new: an account of a change, not a change: wording."],
    ),
]
EDITS = [edit for edit, _ in SENTENCES]


@pytest.mark.parametrize(("edit", "says"), SENTENCES)
def test_a_change_says_what_it_is_and_which_way_it_leans(edit, says, changes):
    """One sentence a change, whole."""
    found = changes(edit)
    assert [change.says for change in found] == says
    for change in found:
        assert change.says.endswith(f": {change.grade}.")
        assert change.says.startswith(change.clause)


def test_a_renamed_predictor_is_one_less_and_one_more(make, pump, pump_data):
    """A name is all that tells one column from another; its place in the list does not."""
    pump_data["predictors"][1] = {"column": "heat", "unit": "m"}
    pump_data |= {"products": [], "keep": pump_data["keep"][:2], "derive": []}
    base = make(lambda data: data.update(products=[], keep=data["keep"][:2]))
    found = plan_changes(base, plan_from_mapping(pump_data))
    assert [(one.clause, one.grade) for one in found] == [
        ("derive[lift]", "different"),
        ("predictors[lift]", "different"),
        ("predictors[heat]", "different"),
    ]


@pytest.mark.parametrize("edit", EDITS)
def test_the_digests_agree_with_the_grades(edit, make, pump):
    """The digest of the decisions moves exactly when a change is more than wording."""
    new = make(edit)
    found = plan_changes(pump, new)
    assert bool(found) is (whole_digest(pump) != whole_digest(new))
    assert any(one.grade != "wording" for one in found) is (decisions_digest(pump) != decisions_digest(new))


def test_the_digests_agree_with_the_grades_for_edits_in_pairs(make):
    """The same between any two edited plans, and what went in one direction came in the other."""
    plans = [(plan, decisions_digest(plan)) for plan in map(make, EDITS)]
    for (old, before), (new, after) in itertools.combinations(plans, 2):
        forth, back = plan_changes(old, new), plan_changes(new, old)
        assert forth
        assert any(one.grade != "wording" for one in forth) is (before != after)
        turned_round = {"looser": "stricter", "stricter": "looser"}
        assert sorted(one.grade for one in forth) == sorted(
            turned_round.get(one.grade, one.grade) for one in back
        )


def test_defaults_comments_and_the_order_of_keys_are_no_change(pump, pump_data):
    """Plans are compared as they are read."""
    assert plan_changes(pump, pump) == ()
    assert plan_changes(pump, plan_from_text(canonical_text(pump))) == ()
    keys = list(pump_data)
    random.Random(3).shuffle(keys)
    assert plan_changes(pump, plan_from_mapping({key: pump_data[key] for key in keys})) == ()
    percent = copy.deepcopy(pump_data) | {"alpha": "5%"}
    assert plan_changes(pump, plan_from_mapping(percent)) == ()


def test_items_are_matched_by_name_when_their_places_change(make, pump):
    """A predictor that moves and changes says both, under its own name."""

    def edit(data: Data) -> None:
        data["predictors"].insert(0, data["predictors"].pop(2))
        data["predictors"][0]["unit"] = "month"
        data["keep"].reverse()

    assert [(one.clause, one.grade) for one in plan_changes(pump, make(edit))] == [
        ("predictors[age].unit", "wording"),
        ("predictors", "different"),
        ("keep", "different"),
    ]


def test_odd_names_stand_in_quotes_and_on_one_line(make):
    """A bracket in a name does not end its place; long texts are cut from where they part."""
    odd = make(added("predictors", {"column": "a]b"}))
    same = make(lambda data: data["predictors"].append({"column": "a]b", "unit": "m"}))
    assert [one.clause for one in plan_changes(odd, same)] == ['predictors["a]b"].unit']
    long = "so many words " * 30
    first = make(at("question", f"{long}here."))
    second = make(at("question", f"{long}there\n\nand there."))
    (change,) = plan_changes(first, second)
    assert "\n" not in change.says
    assert len(change.says) < 250
    assert "here." in change.says
    assert "there" in change.says


def test_text_that_looks_like_a_number_is_told_from_one(make):
    """Whether a cell is compared as a number or as text is a decision."""
    number = make(at("eligibility.0.is", 1))
    text = make(at("eligibility.0.is", "1"))
    (change,) = plan_changes(number, text)
    assert change.says.startswith('eligibility[phase].is from 1 to "1":')


def long_plan(predictors: int, alpha: float, wider: int) -> str:
    """A plan of about six lines a predictor."""
    lines = ["language: 1", "title: Long", "question: How long?", "data: {file: long.csv}"]
    lines += ["outcome: {column: y}", "predictors:"]
    for number in range(predictors):
        lines += [f"  - column: x{number}", "    unit: kg", f"    range: [0, {100 + number + wider}]"]
        lines += ["    role: candidate", f"    because: Reason {number}."]
    lines.append("keep:")
    for number in range(predictors // 4):
        lines += [f"  - predictor: x{number}", "    rule: always", "    because: Theory."]
    return "\n".join([*lines, f"alpha: {alpha}", ""])


def test_a_plan_of_2000_lines_compares_faster_than_it_is_read():
    """Twice the time of reading both is allowed; in fact it takes a fraction, so that noise is no matter."""
    texts = long_plan(347, 0.05, 0), long_plan(347, 0.10, 1)
    assert all(2000 <= text.count("\n") < 2010 for text in texts)
    started = time.process_time()
    old, new = (plan_from_text(text) for text in texts)
    read = time.process_time()
    found = plan_changes(old, new)
    compared = time.process_time()
    assert len(found) == 348
    assert compared - read <= 2 * (read - started)


def test_matching_is_one_look_at_each_name(monkeypatch):
    """The work grows with the plan, not with its square."""
    from beforehand.comparing import matching

    asked: list[object] = []
    plain = matching._name
    monkeypatch.setattr(matching, "_name", lambda item: (asked.append(item), plain(item))[1])
    old, new = (plan_from_text(long_plan(300, 0.05, wider)) for wider in (0, 1))
    plan_changes(old, new)
    assert len(asked) <= 2 * (300 + 75)
