"""Reading a plan: from file, text and mapping; every fault at once, each with its line."""

from __future__ import annotations

import copy
import os
import subprocess
import sys
import time
from pathlib import Path
from typing import Any

import pytest

from beforehand.faults import EXIT_UNUSABLE, PlanError
from beforehand.plan import Plan, canonical_text, plan_from_mapping, plan_from_text, read_plan, written_out

BAD = """\
language: 1
titel: Honey
question: Q
data: {file: ../hives.csv, row_lable: hive}
outcome: {column: honey, range: [5, 1]}
predictors:
  - {column: bloom, rol: focal}
  - {colum: rain}
  - {column: honey}
  - {column: breed, kind: category, levels: [dark, yellow, dark], baseline: brown}
keep:
  - {predictor: bloom, rule: allways, because: theory}
  - {predictor: moon, rule: always, because: theory}
alpha: 120%
steps: [selection, missing_data, transform]
influence: {flag_when: {cooks_distance: 4/m}}
at_most: 3%
errors: {cluster: honey}
alternatives:
  none: {}
  same: {intercept: true}
  worse: {selection: {methd: none}}
"""


def faults_of(text: str) -> list[str]:
    """The faults of a text, as a person reads them."""
    with pytest.raises(PlanError) as refused:
        plan_from_text(text, "hives.plan.yaml")
    return [str(fault).removeprefix("hives.plan.yaml:") for fault in refused.value.faults]


def test_all_faults_at_once() -> None:
    """Faults of shape hide no fault of fit, nothing is said twice, and all come in the order of the lines."""
    assert faults_of(BAD) == [
        "1: title: is missing",
        "2: titel: is not a key that stands here (nearest: 'title')",
        "4: data.row_lable: is not a key that stands here (nearest: 'row_label')",
        "4: data.file: leaves the plan's folder; a data file stands inside it, so that both travel together",
        "5: outcome.range: runs from 5 to 1; the lower end comes first",
        "7: predictors[0].rol: is not a key that stands here (nearest: 'role')",
        "8: predictors[1].column: is missing",
        "8: predictors[1].colum: is not a key that stands here (nearest: 'column')",
        "9: predictors[2].column: is the outcome 'honey'; an outcome cannot predict itself",
        "10: predictors[3].levels[2]: names 'dark' a second time",
        "10: predictors[3].baseline: is 'brown', which is not among the levels dark, yellow, dark",
        "12: keep[0].rule: is 'allways'; it must be always or {unless_p_above: 0.20}",
        "14: alpha: is 1.2; it must lie between 0 and 1, both excluded",
        "15: steps[2]: is 'transform'; it must be missing_data, transforms, collinearity, influence, "
        "selection or final_checks (nearest: 'transforms')",
        "15: steps[1]: has missing_data after selection; it comes first",
        "16: influence.flag_when.cooks_distance: has 'm', but only n and p have a meaning here "
        "(a limit is a number or a formula in n and p, such as 4/n)",
        "17: at_most: is not a key that stands here (it belongs to the plan as influence.at_most)",
        "18: errors.cluster_by: is missing",
        "18: errors.cluster: is not a key that stands here (nearest: 'cluster_by')",
        "20: alternatives.none: is empty; it must be changes, such as {alpha: 0.01}",
        "21: alternatives.same: changes nothing",
        "22: alternatives.worse.selection.methd: is not a key that stands here (nearest: 'method')",
    ]


def test_a_name_is_not_unknown_while_the_list_is_broken() -> None:
    """While a predictor's own name cannot be read, no rule is said to name an unknown predictor."""
    text = BAD.replace("colum: rain", "column: rain")
    assert "13: keep[1].predictor: names 'moon', which is not among the predictors" in faults_of(text)
    assert not [line for line in faults_of(BAD) if "moon" in line]


def test_yaml_faults_beside_others() -> None:
    """A duplicate key or an alias hides no other fault."""
    text = (
        "language: 1\ntitle: T\ntitle: U\nquestion: *q\n"
        "data: {file: a.csv}\noutcome: {column: y}\npredictors: []\n"
    )
    assert faults_of(text) == [
        "3: title: stands twice (first in line 2)",
        "4: question: has an alias, *q; write the value out",
        '4: question: is empty; it must be text (the word null stands in quotes: "null")',
        "7: predictors: has no entry; it must have at least one entry",
    ]


def test_broken_yaml_is_one_fault() -> None:
    """Where YAML breaks off there is nothing more to say."""
    assert faults_of("language: 1\ntitle: a: b\n") == ["2: has a second colon; put the text in quotes"]


def test_nothing_but_a_title() -> None:
    """What must be written and is not, is listed."""
    assert faults_of("title: T\n") == [
        "1: language: is missing",
        "1: question: is missing",
        "1: data: is missing",
        "1: outcome: is missing",
        "1: predictors: is missing",
    ]


def test_another_language(large_text: str) -> None:
    """A plan of a newer language is not looked into; any other is simply wrong."""
    assert faults_of(large_text.replace("language: 1", "language: 2").replace("alpha:", "alfa:")) == [
        "1: language: is 2, a version of the plan language newer than this program, which reads 1"
    ]
    assert faults_of(large_text.replace("language: 1", "language: 0")) == [
        "1: language: is '0'; it must lie between 1 and 1"
    ]


def test_origin(tmp_path: Path, large_text: str) -> None:
    """A plan knows the file it was read from, as the caller named it, and the line of each field."""
    path = tmp_path / "hives.plan.yaml"
    path.write_text(large_text, encoding="utf-8")
    plan = read_plan(path)
    assert plan.origin is not None
    assert (plan.origin.path, plan.origin.name) == (path, os.fspath(path))
    lines = large_text.splitlines()
    assert "alpha: 5%" in lines[plan.origin.lines["alpha"] - 1]
    assert "column: warm, unit" in lines[plan.origin.lines["predictors[2].unit"] - 1]
    assert plan_from_mapping(written_out(plan)).origin is None
    assert read_plan(str(path)) == plan_from_text(large_text)


@pytest.mark.parametrize(
    ("name", "what"),
    [("none.plan.yaml", "there is no such file"), (".", "is a folder; a plan is a file")],
)
def test_unreadable_files(name: str, what: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """A file that cannot be read is a fault that names it as given."""
    monkeypatch.chdir(tmp_path)
    with pytest.raises(PlanError) as refused:
        read_plan(name)
    assert str(refused.value) == f"{name}: {what}"
    assert refused.value.exit_code == EXIT_UNUSABLE


def test_more_unreadable_files(tmp_path: Path) -> None:
    """A name that no system takes, a file that is too large and one that is no text are faults too."""
    with pytest.raises(PlanError) as refused:
        read_plan("a\x00b")
    assert str(refused.value) == "a\x00b: cannot be read: embedded null byte"
    large, binary = tmp_path / "large", tmp_path / "binary"
    large.write_bytes(b"#" * 2_000_001)
    binary.write_bytes(b"\x89PNG\r\n")
    for path, what in (
        (large, ": is larger than 2,000,000 bytes"),
        (binary, ":1: is not UTF-8 text; save it as UTF-8"),
    ):
        with pytest.raises(PlanError) as refused:
            read_plan(path)
        assert str(refused.value) == f"{path}{what}"


def test_many_faults_are_cut() -> None:
    """A file of another kind does not fill the screen."""
    text = "\n".join(f"key{n}: 1" for n in range(500))
    faults = faults_of(text)
    assert len(faults) == 201
    assert faults[-1] == " has 306 more faults, not listed"


def test_place_of_a_strange_key() -> None:
    """A key with a line end in it stays on one line."""
    (first, *_) = faults_of('language: 1\n"a\\nb c": 1\n')
    assert first == "1: title: is missing"
    assert '2: "a\\nb c": is not a key that stands here' in faults_of('language: 1\n"a\\nb c": 1\n')


def test_key_order_means_nothing(large_text: str) -> None:
    """The order of the keys of every mapping is free."""

    def turned(value: Any) -> Any:
        if isinstance(value, dict):
            return {key: turned(value[key]) for key in reversed(value)}
        return [turned(item) for item in value] if isinstance(value, list) else value

    plan = plan_from_text(large_text)
    other = plan_from_mapping(turned(written_out(plan)))
    assert other == plan
    assert canonical_text(other) == canonical_text(plan)
    assert list(other.alternatives) == list(plan.alternatives)


def test_the_mapping_is_left_alone(small: dict[str, Any]) -> None:
    """Reading a mapping changes nothing in it."""
    before = copy.deepcopy(small)
    plan_from_mapping(small)
    assert small == before


def test_too_deep_in_memory(small: dict[str, Any]) -> None:
    """A mapping that contains itself is refused."""
    small["alternatives"] = {"a": small}
    with pytest.raises(PlanError):
        plan_from_mapping(small)


def test_a_plan_of_two_thousand_lines_is_quick(large_text: str) -> None:
    """Reading takes well under half a second."""
    more = "".join(
        f"  - column: x{n}\n    unit: kg\n    range: [0, {n + 1}]\n    because: it may matter\n"
        for n in range(500)
    )
    text = large_text.replace("products:\n", more + "products:\n")
    assert len(text.splitlines()) > 2000
    start = time.perf_counter()
    plan_from_text(text)
    assert time.perf_counter() - start < 0.5


def test_importing_is_light() -> None:
    """Importing the plan language brings in no numerical library and no YAML parser."""
    code = (
        "import sys, beforehand.plan; "
        "heavy = ('numpy', 'scipy', 'pandas', 'statsmodels', 'yaml', 'typer', 'rich'); "
        "print([name for name in heavy if name in sys.modules])"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"


def test_plans_are_values(large: Plan, large_text: str) -> None:
    """Two readings of the same text are equal and hash alike, wherever they were read."""
    again = plan_from_text(large_text, "elsewhere")
    assert again == large
    assert hash(again) == hash(large)
    assert again != plan_from_text(large_text.replace("alpha: 5%", "alpha: 6%"))
