"""Strict YAML: what comes out, with which lines, and what is refused in which words."""

from __future__ import annotations

import sys
import time

import pytest
import yaml

from beforehand.faults import LockError, PlanError
from beforehand.plan.written import Plain
from beforehand.plan.yaml_nodes import MOST_BYTES, NotYamlError, document_of, read_yaml, typed

TEXT = """\
# a comment
title: é no
list: [a, "1", {c: 'x', d: 1}]
nested:
  - key: value
    other:
      - deep
empty:
"dotted.key": 1
block: |
  two
  lines
"""


def test_data() -> None:
    """Mappings are dicts, lists are tuples, quoted text is text, unquoted text is left to the field."""
    data = document_of(TEXT).data
    assert data == {
        "title": "é no",
        "list": ("a", "1", {"c": "x", "d": "1"}),
        "nested": ({"key": "value", "other": ("deep",)},),
        "empty": None,
        "dotted.key": "1",
        "block": "two\nlines\n",
    }
    assert [type(item) for item in (data["title"], data["list"][0], data["list"][1])] == [Plain, Plain, str]
    assert type(data["block"]) is str


def test_lines() -> None:
    """Every key and every item of a list has its line."""
    assert document_of(TEXT).lines == {
        "title": 2,
        "list": 3,
        "list[0]": 3,
        "list[1]": 3,
        "list[2]": 3,
        "list[2].c": 3,
        "list[2].d": 3,
        "nested": 4,
        "nested[0]": 5,
        "nested[0].key": 5,
        "nested[0].other": 6,
        "nested[0].other[0]": 7,
        "empty": 8,
        '"dotted.key"': 9,
        "block": 10,
    }


def test_lines_can_be_left_out() -> None:
    """Without lines the data are the same."""
    document = document_of(TEXT, lines=False)
    assert document.lines == {}
    assert document.data == document_of(TEXT).data


@pytest.mark.parametrize(
    ("raw", "message"),
    [
        (b"", "f:1: is empty"),
        (b"# only words\n", "f:1: is empty"),
        (b"word", "f:1: must be a mapping of keys, such as title: …"),
        (b"[1, 2]", "f:1: must be a mapping of keys, such as title: …"),
        (b"a: 1\nb: 2\na: 3\n", "f:3: a: stands twice (first in line 1)"),
        (b"m:\n  x: 1\n  'x': 2\n", "f:3: m.x: stands twice (first in line 2)"),
        (b"a: &here 1\n", "f:1: a: has an anchor, &here; only plain data is read"),
        (b"a: *here\n", "f:1: a: has an alias, *here; write the value out"),
        (b"a: 1\n<<: {b: 2}\n", "f:2: <<: merges a mapping with <<; write the keys out"),
        (b"a: !!str 1\n", "f:1: a: has a tag, tag:yaml.org,2002:str; only plain data is read"),
        (b"a: !thing {b: 1}\n", "f:1: a: has a tag, !thing; only plain data is read"),
        (b"%TAG ! tag:x:\n---\na: 1\n", "f:1: declares tags; only plain data is read"),
        (b"a: 1\n---\nb: 2\n", "f:2: starts a second document; a file holds one"),
        (b"a: 1\n...\nb: 2\n", "f:3: goes on after the end of its document; a file holds one"),
        (b"\ta: 1\n", "f:1: is indented with a tab; YAML wants blanks"),
        (b"a:\n\tb: 1\n", "f:2: is indented with a tab; YAML wants blanks"),
        (b"a: 1\nb:\t2\n", "f:2: has a tab between its words; YAML wants blanks"),
        (b"a: \xff\n", "f:1: is not UTF-8 text; save it as UTF-8"),
        (b"a: 1\nb: \xe4\n", "f:2: is not UTF-8 text; save it as UTF-8"),
        ("a: 1".encode("utf-16"), "f:1: is not UTF-8 text; save it as UTF-8"),
        (b"a: 1\nb: \x00\n", "f:2: has the control character U+0000; the file is not plain text"),
        (b"\x7fELF", "f:1: has the control character U+007F; the file is not plain text"),
        (b'a: "\\0"\n', "f:1: a: has a control character in its text"),
        (b"a: [1, 2\n", "f:2: has a list that is never closed with ]"),
        (b"a: {b: 1\n", "f:2: has a mapping that is never closed with }"),
        (b"a: b: c\n", "f:1: has a second colon; put the text in quotes"),
        (b"a: 'b\n", "f:2: has a quote that is never closed"),
        (b"a: @b\n", "f:1: has a character that must stand in quotes"),
        (b"a: 100%\nb: %\n", "f:2: has a character that must stand in quotes"),
        (b'a: "\\q"\n', "f:1: has a backslash in double quotes that means nothing; use single quotes"),
        (b"? [a]\n: b\n", "f:1: has a mapping or list for a key; a key is text"),
        (b"a: 1\n b: 2\n", "f:2: has a second colon; put the text in quotes"),
        (b"a:\n  b: 1\n c: 2\n", "f:3: is indented differently from the keys above, or lacks a comma"),
        (b"a:\n- b\n  - c\nd\n", "f:5: has a key without a colon"),
        (b"a: " + b"[" * 51 + b"]" * 51, "f:1: is nested deeper than 50"),
        (b"[" * 5000, "f:1: is nested deeper than 50"),
        (b"a: " + b"{a: " * 5000, "f:1: is nested deeper than 50"),
        (b"a" * (MOST_BYTES + 1), "f: is larger than 2,000,000 bytes"),
    ],
)
def test_refused(raw: bytes, message: str) -> None:
    """What is not plain YAML is one line that says where and why."""
    with pytest.raises(PlanError) as refused:
        read_yaml(raw, "f")
    assert str(refused.value) == message


def test_all_at_once() -> None:
    """Aliases, tags and duplicates do not hide each other, in whichever error the caller wants."""
    with pytest.raises(LockError) as refused:
        read_yaml(b"a: &x 1\nb: *x\na: 2\nc: !t 3\n", "f.lock.yaml", error=LockError)
    assert [str(fault) for fault in refused.value.faults] == [
        "f.lock.yaml:1: a: has an anchor, &x; only plain data is read",
        "f.lock.yaml:2: b: has an alias, *x; write the value out",
        "f.lock.yaml:3: a: stands twice (first in line 1)",
        "f.lock.yaml:4: c: has a tag, !t; only plain data is read",
    ]


def test_an_alias_bomb_costs_nothing() -> None:
    """Aliases are never followed, so that doubling ones do not grow."""
    lines = ["a0: &a0 [x, x]"] + [f"a{n}: &a{n} [*a{n - 1}, *a{n - 1}]" for n in range(1, 40)]
    start = time.perf_counter()
    with pytest.raises(NotYamlError) as refused:
        document_of("\n".join(lines))
    assert str(refused.value) == "has more faults than are listed; little of it is plain YAML"
    assert time.perf_counter() - start < 1.0


@pytest.mark.parametrize(
    "text",
    [
        "a: 'one\ttwo'",
        'a: "one\ttwo"',
        "a: one\ttwo",
        "# a\tcomment\na: 1",
        "a: 1 # and\tone\n",
        "a: |\n  one\ttwo\n",
    ],
)
def test_tabs_inside_texts(text: str) -> None:
    """A tab inside a text or a comment is nobody's business."""
    assert list(document_of(text).data) == ["a"]


def test_byte_order_mark() -> None:
    """A byte order mark is taken off, in bytes and in text."""
    assert read_yaml(b"\xef\xbb\xbfa: 1", "f").data == {"a": "1"}
    assert document_of("\ufeffa: 1").data == {"a": "1"}


def test_without_the_compiled_parser(monkeypatch: pytest.MonkeyPatch) -> None:
    """The slower parser of the same library reads the same data and the same lines."""
    fast = document_of(TEXT)
    monkeypatch.delattr(yaml, "CSafeLoader")
    assert document_of(TEXT) == fast
    for broken in ("[" * 3000, "a: b: c", "\ta: 1", "a: 'b", "a: [1"):
        with pytest.raises(NotYamlError):
            document_of(broken)


def test_typed() -> None:
    """A record's unquoted texts become what they look like, and nothing else."""
    data = document_of(
        "{a: 1, b: 1.5, c: 1.0e-05, d: true, e: 'true', f: yes, g: 012x, "
        "h: null, i: [1, '1'], j: -0.0, k: 1e3}"
    ).data
    assert typed(data) == {
        "a": 1, "b": 1.5, "c": 1e-05, "d": True, "e": "true", "f": "yes", "g": "012x", "h": None,
        "i": (1, "1"), "j": 0.0, "k": 1000.0,
    }  # fmt: skip
    assert type(typed(data)["a"]) is int
    assert type(typed(data)["f"]) is str


def test_reading_leaves_the_recursion_limit_alone() -> None:
    """Reading needs no deep recursion of its own."""
    before = sys.getrecursionlimit()
    document_of("a: " + "[" * 49 + "]" * 49)
    assert sys.getrecursionlimit() == before


def test_speed() -> None:
    """Twenty thousand short lines are read in little more than the parser's own time."""
    line = "- {id: R1, step: x, says: 'hello', evidence: {p: 0.04, r: 1.5e-05}, limit: 0.5}\n"
    text = "rulings:\n" + line * 5_000
    start = time.perf_counter()
    document_of(text, lines=False)
    assert time.perf_counter() - start < 2.0
