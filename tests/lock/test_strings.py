"""How text is written."""

from __future__ import annotations

import json

import pytest
import yaml
from hypothesis import example, given
from hypothesis import strategies as st

from beforehand.lock.strings import string_text

text = st.text(st.characters(exclude_categories=["Cs"]))


@pytest.mark.parametrize(
    ("value", "written"),
    [
        ("fan_hours", "fan_hours"),
        ("working model", "working model"),
        ("outdoor_temp × load", "outdoor_temp × load"),
        ("room_type = frozen", "room_type = frozen"),
        ("Bérénice", "Bérénice"),
        ("", '""'),
        ("no", '"no"'),
        ("On", '"On"'),
        ("NULL", '"NULL"'),
        ("1e5", '"1e5"'),
        ("0147", '"0147"'),
        ("2026-12-01", '"2026-12-01"'),
        ("~", '"~"'),
        ("a: b", '"a: b"'),
        ("a, b", '"a, b"'),
        ("a  b", '"a  b"'),
        ("a ", '"a "'),
        ('say "x"', '"say \\"x\\""'),
        ("two\nlines", '"two\\nlines"'),
        ("nel\x85ls\u2028bom\ufeff", '"nel\\u0085ls\\u2028bom\\ufeff"'),
        ("°C", '"°C"'),
    ],
)
def test_text_is_plain_only_where_it_cannot_be_mistaken(value: str, written: str) -> None:
    """Quotes stand where a reader could see a number, a truth value, a date or a sign of YAML."""
    assert string_text(value) == written


@given(text)
@example("=")
@example("<<")
@example("\x00\x7f\x9f\ud7ff\ue000\ufffd\U0001f600")
def test_every_text_reads_back(value: str) -> None:
    """Both loaders of YAML give the text back, as a value, as a key, in flow style and in block style."""
    written = string_text(value)
    assert "\n" not in written
    for loader in (yaml.SafeLoader, yaml.CSafeLoader):
        assert yaml.load(f"a: {written}\n", loader) == {"a": value}
        assert yaml.load(f"{{a: {written}, b: [{written}]}}\n", loader) == {"a": value, "b": [value]}
        assert yaml.load(f"{written}: 1\n", loader) == {value: 1}


@given(text)
def test_quoted_text_is_json(value: str) -> None:
    """What stands in quotes has the escapes of JSON only."""
    written = string_text(value)
    if written.startswith('"'):
        assert json.loads(written) == value
