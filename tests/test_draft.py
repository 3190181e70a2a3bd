"""The draft of a plan from the columns of a table."""

from __future__ import annotations

import math
from pathlib import Path
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from beforehand.drafting import draft_plan
from beforehand.drafting.offers import possible_range
from beforehand.faults import DataError
from beforehand.plan import Plan, decisions_digest, plan_from_mapping, plan_from_text, written_out
from beforehand.table import read_table
from beforehand.table.profile import ColumnProfile, FileProfile, profile_file


def number(name: str, low: float = 1.5, high: float = 80.0, **more: Any) -> ColumnProfile:
    """A column of numbers."""
    return ColumnProfile(
        name=name, kind="number", minimum=low, maximum=high, **{"distinct": 50, "decimals": 1, **more}
    )


def category(name: str, *levels: str) -> ColumnProfile:
    """A column of levels."""
    return ColumnProfile(name=name, kind="category", levels=levels, distinct=len(levels))


def profile(*columns: ColumnProfile, **more: Any) -> FileProfile:
    """A profile of 60 rows."""
    written = {"separator": ",", "decimal": ".", "missing_codes": ("", "NA", "-"), **more}
    return FileProfile(file="rooms.csv", rows=60, columns=columns, **written)


ROOMS = profile(
    ColumnProfile(name="reading", kind="label", distinct=60),
    ColumnProfile(name="date", kind="date", distinct=30),
    ColumnProfile(name="kwh", kind="outcome"),
    number("outdoor", -12.3, 38.1),
    number("load", share_missing=0.02),
    category("kind", "chilled", "frozen"),
    ColumnProfile(name="site", kind="constant", levels=("A",), distinct=1),
    ColumnProfile(name="memo", kind="text", distinct=41),
    number("serial", 1.0, 60.0, whole=True, decimals=0, distinct=60),
    ColumnProfile(name="spare", kind="empty", share_missing=1.0),
)


def drafted(made: FileProfile = ROOMS, outcome: str = "kwh") -> Plan:
    """A draft, read back."""
    return plan_from_text(draft_plan(made, "rooms.csv", outcome), "rooms.plan.yaml")


def test_a_draft_is_the_defaults_and_the_predictors() -> None:
    """Read back, a draft decides what a plan decides that names the predictors and no rule."""
    short = plan_from_mapping(
        {
            "language": 1,
            "title": "short",
            "question": "short?",
            "data": {"file": "rooms.csv", "row_label": "reading"},
            "outcome": {"column": "kwh"},
            "predictors": [
                {"column": "outdoor", "range": [-20, 40]},
                {"column": "load", "range": [0, 80]},
                {"column": "kind", "kind": "category", "levels": ["chilled", "frozen"]},
            ],
        }
    )
    plan = drafted()
    assert decisions_digest(plan) == decisions_digest(short)
    apart = {"title", "question", "language"}
    ours, theirs = written_out(plan), written_out(short)
    assert {key: ours[key] for key in ours if key not in apart} == {
        key: theirs[key] for key in theirs if key not in apart
    }


def test_a_draft_writes_every_field_out() -> None:
    """Every field of every block stands in the text, so that a reviewer sees each default."""
    plan = drafted()
    assert plan.origin is not None
    places = set(plan.origin.lines)

    def missing(data: Any, path: str) -> list[str]:
        if isinstance(data, dict) and data:
            return [one for key, part in data.items() for one in missing(part, f"{path}.{key}".lstrip("."))]
        return [] if path in places else [path]

    whole = written_out(plan)
    assert [path for key in whole if key != "predictors" for path in missing(whole[key], key)] == []


def test_a_draft_says_why_a_column_is_not_offered() -> None:
    """Labels, dates, constants, texts, counters and empty columns stand in a comment with the reason."""
    text = draft_plan(ROOMS, "rooms.csv", "kwh")
    start = text.index("# Not offered as predictors:\n")
    assert text[start : text.index("\n\n", start)].split("\n") == [
        "# Not offered as predictors:",
        "#   reading: labels the rows",
        "#   date: dates; derive a number where one is wanted",
        "#   site: one value only",
        "#   memo: 41 different texts; a category needs a few levels",
        "#   serial: numbers the rows",
        "#   spare: no value",
    ]


def test_predictors_stand_one_a_line_with_what_was_seen() -> None:
    """Kind, range or levels, role, and a comment with what was seen."""
    lines = draft_plan(ROOMS, "rooms.csv", "kwh").split("\n")
    assert [line for line in lines if line.startswith("  - {column: ")] == [
        "  - {column: outdoor, kind: number, range: [-20, 40], role: candidate}  # seen -12.3 to 38.1",
        "  - {column: load, kind: number, range: [0, 80], role: candidate}  # seen 1.5 to 80; 2 % missing",
        "  - {column: kind, kind: category, levels: [chilled, frozen], baseline: chilled, role: candidate}"
        "  # please choose the baseline",
    ]


def test_labels_and_dates_are_offered_in_their_places() -> None:
    """A label column labels the rows; a date is proposed as their order, in a comment."""
    text = draft_plan(ROOMS, "rooms.csv", "kwh")
    assert "  row_label: reading  # a different entry in each row\n" in text
    assert "    in_order_of: null  # please, where rows have an order: its column, such as date\n" in text
    bare = draft_plan(profile(number("load")), "rooms.csv", "kwh")
    assert (
        "  row_label: null  # please, where a column names each row; without one rows are numbered\n" in bare
    )


def test_a_counter_labels_the_rows_where_nothing_else_does() -> None:
    """Whole numbers from 1 to n, each once, are a label and no predictor."""
    made = profile(number("load"), number("serial", 1.0, 60.0, whole=True, distinct=60))
    plan = drafted(made)
    assert plan.data.row_label == "serial"
    assert [one.column for one in plan.predictors] == ["load"]


def test_what_only_a_person_knows_is_marked() -> None:
    """The question, unit, range and the smallest effect of the outcome wait with a "please"."""
    text = draft_plan(ROOMS, "rooms.csv", "kwh")
    for key in ("question", "written_by", "  unit", "  smallest_effect_that_matters", "  range"):
        (line,) = [line for line in text.split("\n") if line.startswith(f"{key}: ")]
        assert "  # please" in line


def test_the_way_the_file_is_written_is_kept() -> None:
    """Separator, decimal mark and missing codes come from the file."""
    made = profile(number("load"), separator=";", decimal=",", missing_codes=("", "NA", "-", "?"))
    data = drafted(made).data
    assert (data.separator, data.decimal, data.missing_codes) == (";", ",", ("", "NA", "-", "?"))


def test_a_title_can_be_given() -> None:
    """A title is taken as it is, whatever signs are in it."""
    plan = plan_from_text(draft_plan(ROOMS, "rooms.csv", "kwh", title='Rooms: "cold" #1'), "a.plan.yaml")
    assert plan.title == 'Rooms: "cold" #1'
    assert drafted().title == "What goes with kwh"


ODD = (
    *("no", "null", "12", "1e3", "a: b", "# x", "- y", "x, y", "'q'", '"q"', "{z}", "[w]", "tab\there"),
    *("°C", "*a", "&b", "!t", "%d", "@", "`", "?", "|", ">", "=", "~", "2026-12-01", "ünï", "a\u2028b"),
    *("\ufeffz", "end:", "\\n"),
)


@pytest.mark.parametrize("name", ODD)
def test_odd_names_read_back_as_they_are(name: str) -> None:
    """A name is text whatever it looks like, as a predictor, as an outcome and as a level."""
    made = profile(number(name, -5.0, 5.0), number("load"), category("kind", name, "other"))
    plan = plan_from_text(draft_plan(made, "rooms.csv", f"{name}!"), "a.plan.yaml")
    assert plan.outcome.column == f"{name}!"
    assert plan.predictors[0].column == name
    assert plan.predictors[2].levels == (name, "other")


@settings(max_examples=60, deadline=None)
@given(
    names=st.lists(
        st.text(st.characters(exclude_categories=("Cs", "Cc")), min_size=1, max_size=12),
        min_size=2,
        max_size=5,
        unique_by=str.strip,
    ),
    ends=st.tuples(st.floats(-1e12, 1e12), st.floats(-1e12, 1e12)),
)
def test_any_names_and_numbers_read_back(names: list[str], ends: tuple[float, float]) -> None:
    """Whatever a column is called and holds, the draft is a plan without a fault."""
    *columns, outcome = names
    if not outcome.strip() or not any(name.strip() for name in columns):
        return
    low, high = min(ends), max(ends)
    made = profile(*(number(name, low, high) for name in columns))
    plan = plan_from_text(draft_plan(made, "rooms.csv", outcome), "a.plan.yaml")
    assert [one.column for one in plan.predictors] == [name for name in columns if name.strip()]


def test_a_name_over_two_lines_is_left_out() -> None:
    """A plan cannot name such a column, nor such a level; both are told in a comment."""
    made = profile(number("two\nlines"), category("kind", "a\nb", "c"), number("load"))
    text = draft_plan(made, "rooms.csv", "kwh")
    assert "#   'two\\nlines': a plan cannot name it; rename the column\n" in text
    assert "#   kind: a level runs over more than one line\n" in text
    assert [one.column for one in plan_from_text(text, "a.plan.yaml").predictors] == ["load"]


def test_a_table_without_a_predictor_is_refused() -> None:
    """Nothing but a label and the outcome: one line says what is missing."""
    made = profile(ColumnProfile(name="reading", kind="label"), ColumnProfile(name="kwh", kind="outcome"))
    with pytest.raises(DataError) as caught:
        draft_plan(made, "rooms.csv", "kwh")
    assert str(caught.value) == (
        "rooms.csv: no column beside the outcome holds numbers or a few levels, so none can be a predictor"
    )


def test_an_outcome_without_a_name_is_refused() -> None:
    """An outcome over two lines cannot stand in a plan."""
    with pytest.raises(DataError) as caught:
        draft_plan(profile(number("load")), "rooms.csv", "k\nwh")
    assert str(caught.value) == (
        "rooms.csv:1: 'k\\nwh': an outcome needs a name on one line; rename the column"
    )


def test_numbers_below_zero_everywhere_leave_a_plan_that_can_be_read() -> None:
    """The default ladder has a square root; ranges below 0 are written all the same."""
    plan = drafted(profile(number("outdoor", -5.0, 5.0), number("gap", -3.0, -1.0)))
    assert [one.range for one in plan.predictors] == [(-6.0, 6.0), (-3.0, -1.0)]


@pytest.mark.parametrize(
    ("low", "high", "expected"),
    [
        (-12.3, 38.1, (-20.0, 40.0)),
        (1.5, 80.0, (0.0, 80.0)),
        (0.12, 0.87, (0.1, 0.9)),
        (0.0, 1.0, (0.0, 1.0)),
        (1012.0, 1030.0, (1012.0, 1030.0)),
        (3e-7, 2.2e-6, (2e-7, 2.2e-6)),
        (-0.0, 7.0, (0.0, 7.0)),
    ],
)
def test_ranges_are_rounded_outward(low: float, high: float, expected: tuple[float, float]) -> None:
    """To steps of 1, 2 or 5 times a power of ten, a fifth of the span or less."""
    assert possible_range(low, high) == expected


@given(st.floats(allow_nan=False, allow_infinity=False), st.floats(allow_nan=False, allow_infinity=False))
def test_a_range_holds_what_was_seen(one: float, other: float) -> None:
    """The rounded range never excludes a seen value, is never wider than 7/5, and keeps the side of 0."""
    low, high = min(one, other), max(one, other)
    found = possible_range(low, high)
    if found is None:
        assert low == high or math.isinf(high - low)
        return
    assert found[0] <= low < high <= found[1]
    assert found[1] - found[0] <= 1.4 * (high - low) * (1.0 + 1e-9) + 4.0 * math.ulp(max(abs(low), abs(high)))
    assert (low < 0.0) or (found[0] >= 0.0)


def table(path: Path, outcome: list[str]) -> Path:
    """A table of invented readings in a file."""
    lines = ["reading,date,room type,kwh,outdoor °C,load"]
    for k in range(30):
        room = "no" if k % 3 else "yes"
        lines.append(f"r{k},2026-01-{1 + k % 28:02d},{room},{outcome[k]},{k * 0.7 - 9:.1f},{k * k % 41}")
    path.write_text("\n".join(lines) + "\n", encoding="utf-8")
    return path


def test_a_drafted_plan_reads_the_table_it_was_drafted_from(tmp_path: Path) -> None:
    """Kinds, levels and ranges of the draft fit every row of the table."""
    path = table(tmp_path / "rooms.csv", [str(300 + k) for k in range(30)])
    text = draft_plan(profile_file(path, "kwh"), path.name, "kwh")
    plan = plan_from_text(text, "rooms.plan.yaml")
    assert [(one.column, one.kind) for one in plan.predictors] == [
        ("room type", "category"),
        ("outdoor °C", "number"),
        ("load", "number"),
    ]
    assert plan.predictors[0].levels == ("no", "yes")
    assert read_table(plan, path).n_rows == 30


def test_the_values_of_the_outcome_change_nothing(tmp_path: Path) -> None:
    """Any outcome, even one that is no number, gives the same draft."""
    plain = table(tmp_path / "rooms.csv", [str(300 + k) for k in range(30)])
    first = draft_plan(profile_file(plain, "kwh"), "rooms.csv", "kwh")
    other = table(tmp_path / "rooms.csv", ["secret", *["" for _ in range(29)]])
    assert draft_plan(profile_file(other, "kwh"), "rooms.csv", "kwh") == first
    assert "secret" not in first
