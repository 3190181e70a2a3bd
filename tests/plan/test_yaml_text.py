"""Plain data as YAML text: every reader takes it for the same data."""

from __future__ import annotations

import math
from typing import Any

import pytest
import yaml
from hypothesis import given, settings
from hypothesis import strategies as st

from beforehand.plan.yaml_nodes import document_of, typed
from beforehand.plan.yaml_text import scalar, yaml_text


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (None, "null"),
        (True, "true"),
        (False, "false"),
        (3, "3"),
        (-2, "-2"),
        (0.05, "0.05"),
        (5.0, "5"),
        (1e-05, "1.0e-05"),
        (1.5e-07, "1.5e-07"),
        (1e22, "1.0e+22"),
        (1e15, "1000000000000000.0"),
        (-0.0, "0"),
        ("word", "word"),
        ("two words", "two words"),
        ("4/n", "4/n"),
        ("3*p/n", "3*p/n"),
        ("°C", "°C"),
        ("2*sqrt(p/n)", "2*sqrt(p/n)"),
        ("no", '"no"'),
        ("On", '"On"'),
        ("y", '"y"'),
        ("null", '"null"'),
        ("", '""'),
        ("1", '"1"'),
        ("1e3", '"1e3"'),
        ("2026-12-01", '"2026-12-01"'),
        ("-", '"-"'),
        ("a: b", '"a: b"'),
        ("a #b", '"a #b"'),
        ("a\nb", '"a\\nb"'),
        ("it's", '"it\'s"'),
        ('"', '"\\""'),
        (" a", '" a"'),
        ("a ", '"a "'),
        ("\x85\u2028\ufeff", '"\\u0085\\u2028\\ufeff"'),
        ("[a]", '"[a]"'),
        ("a, b", '"a, b"'),
        ("*a", '"*a"'),
        ("!a", '"!a"'),
        ("?", '"?"'),
        ("0x1f", '"0x1f"'),
        ("1:30", '"1:30"'),
    ],
)
def test_scalars(value: Any, text: str) -> None:
    """A value is written so that no reader takes it for anything else."""
    assert scalar(value) == text
    assert yaml.safe_load(f"{{a: {text}}}") == {"a": value}


def test_layout() -> None:
    """What is short stands on one line; lists of mappings have a line each; prose needs no quotes."""
    data = {
        "because": "Rain, as the keeper's book says (2019), keeps bees in.",
        "fill": {},
        "block": {
            "inner": {"a": 1, "b": [1, 2]},
            "long": {f"key{n}": "a rather long value" for n in range(5)},
        },
        "items": [{"a": 1}, {"because": "x" * 100, "list": ["y", "no"], "none": None}],
        "pairs": [["a", "b"], ["c", "d"]],
        "many": [f"a rather long word {n}" for n in range(6)],
    }
    assert yaml_text(data).splitlines() == [
        "because: Rain, as the keeper's book says (2019), keeps bees in.",
        "fill: {}",
        "block:",
        "  inner: {a: 1, b: [1, 2]}",
        "  long:",
        *(f"    key{n}: a rather long value" for n in range(5)),
        "items:",
        "  - {a: 1}",
        "  - because: " + "x" * 100,
        '    list: [y, "no"]'.replace("[y", '["y"'),
        "    none: null",
        "pairs: [[a, b], [c, d]]",
        "many:",
        *(f"  - a rather long word {n}" for n in range(6)),
    ]
    assert yaml.safe_load(yaml_text(data)) == data


TEXTS = st.text(st.characters(exclude_categories=["Cs"], exclude_characters="\ufffe\uffff"), max_size=20)
VALUES = st.recursive(
    st.one_of(
        st.none(),
        st.booleans(),
        st.integers(),
        st.floats(allow_nan=False, allow_infinity=False),
        TEXTS,
        st.text("abno°y0.1e-+*/ ,'?!:#", max_size=8),
    ),
    lambda inner: st.one_of(st.lists(inner, max_size=4), st.dictionaries(TEXTS, inner, max_size=4)),
    max_leaves=10,
)


@given(st.dictionaries(TEXTS, VALUES, min_size=1, max_size=4))
@settings(deadline=None, max_examples=200)
def test_any_data_comes_back(data: dict[str, Any]) -> None:
    """Whatever plain data is written, YAML readers find it again, to the last digit."""
    assert _close(yaml.safe_load(yaml_text(data)), data)


@given(st.dictionaries(st.from_regex(r"\w{1,5}", fullmatch=True), VALUES, min_size=1, max_size=4))
@settings(deadline=None, max_examples=100)
def test_our_reader_agrees(data: dict[str, Any]) -> None:
    """The strict reader of plans and records finds the same data, or refuses control characters."""
    try:
        found = typed(document_of(yaml_text(data)).data)
    except ValueError:
        return
    if not document_of(yaml_text(data)).faults:
        assert _close(found, data)


def _close(found: Any, data: Any) -> bool:
    """Whether two pieces of plain data are the same, lists and tuples alike, whole floats as integers."""
    if isinstance(data, dict):
        return (
            isinstance(found, dict)
            and list(found) == list(data)
            and all(_close(found[key], data[key]) for key in data)
        )
    if isinstance(data, list):
        return len(found) == len(data) and all(map(_close, found, data))
    if isinstance(data, float):
        return math.isclose(found, data, rel_tol=0, abs_tol=0) and not isinstance(found, str)
    return type(found) is type(data) and bool(found == data)
