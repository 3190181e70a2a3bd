"""Lines in the layout of a lock turn into JSON."""

from __future__ import annotations

import json
from typing import Any

import pytest

from beforehand.lock.layout import LayoutError, json_of


def read(text: str) -> Any:
    """Read lines through JSON."""
    return json.loads(json_of(text.split("\n")))


@pytest.mark.parametrize(
    ("text", "content"),
    [
        ("a: 1", {"a": 1}),
        ("a: {}\nb: []", {"a": {}, "b": []}),
        ("a:\n  b: load\nc: null", {"a": {"b": "load"}, "c": None}),
        (
            "a:\n  - {b: -1.0e-05, c: true}\n  - {b: x y, c: e5}",
            {"a": [{"b": -1e-5, "c": True}, {"b": "x y", "c": "e5"}]},
        ),
        ("a:\n  - b: 1\n    c:\n      - d\n  - b: 2", {"a": [{"b": 1, "c": ["d"]}, {"b": 2}]}),
        (
            'a: {"no": [null, nullable, "x: {y}"], b: {c: [[1, z]]}}',
            {"a": {"no": [None, "nullable", "x: {y}"], "b": {"c": [[1, "z"]]}}},
        ),
        ('"a: b": "c\\nd"', {"a: b": "c\nd"}),
    ],
)
def test_the_part_of_yaml_that_locks_use_turns_into_json(text: str, content: Any) -> None:
    """Blocks, flow values, plain and quoted text, numbers and JSON's words."""
    assert read(text) == content


@pytest.mark.parametrize(
    "text", ["a:\n  - - b", "a: 'b'", "a: b # c", "a: {b: c", "a: *b", "a: |", "a: [1,, 2]"]
)
def test_other_parts_of_yaml_turn_into_nothing(text: str) -> None:
    """Comments, other quotes, anchors and blocks of text give no JSON, so that the parser refuses them."""
    with pytest.raises(json.JSONDecodeError):
        read(text)


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("", "line 1: it is neither 'key: value' nor '- item'"),
        ("a", "line 1: it is neither 'key: value' nor '- item'"),
        ("  a: 1", "line 1: it should be indented by two blanks under its key"),
        ("a:", "line 1: a value should follow it"),
        ("a:\nb: 1", "line 2: it should be indented by two blanks under its key"),
        ("a: 1\n  b: 2", "line 2: its indent fits no line above"),
        ("a:\n  - 1\n  b: 2", "line 3: its indent fits no line above"),
        ("a: 1\n- 2", "line 2: its indent fits no line above"),
        ("\n".join("  " * depth + "a:" for depth in range(70)), "line 61: it is nested too deeply"),
    ],
)
def test_lines_without_a_place_are_told(text: str, said: str) -> None:
    """What has no place in a lock is told with its line."""
    with pytest.raises(LayoutError) as raised:
        json_of(text.split("\n"))
    assert str(raised.value) == said
