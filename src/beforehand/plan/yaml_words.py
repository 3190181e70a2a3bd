"""What a YAML parser finds wrong, as a person would say it."""

from __future__ import annotations

import re
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    import yaml

# Plans nest to about 6 and locks to about 10.
MOST_DEPTH = 50
TOO_DEEP = f"is nested deeper than {MOST_DEPTH}"

# What no text of a file holds: control characters but tab and line end, and halves of characters.
STRANGE_IN_VALUE = re.compile("[\x00-\x08\x0b-\x1f\x7f-\x9f\ud800-\udfff\ufffe\uffff]")

# Part of the parser's words, and ours; the first that fits.
_WORDS = (
    ("cannot start any token", "has a character that must stand in quotes"),
    ("mapping values are not allowed", "has a second colon; put the text in quotes"),
    ("could not find expected ':'", "has a key without a colon"),
    ("did not find expected ',' or ']'", "has a list that is never closed with ]"),
    ("expected ',' or ']'", "has a list that is never closed with ]"),
    ("did not find expected ',' or '}'", "has a mapping that is never closed with }"),
    ("expected ',' or '}'", "has a mapping that is never closed with }"),
    ("unexpected end of stream", "has a quote that is never closed"),
    ("found unexpected document indicator", "has a quote that is never closed"),
    ("did not find expected key", "is indented differently from the keys above, or lacks a comma"),
    ("did not find expected '-'", "is indented differently from the items above"),
    ("expected <block end>", "is indented differently from the lines above"),
    ("maximum nesting", TOO_DEEP),
    ("did not find expected node content", "breaks off where a value is expected"),
    ("did not find expected <document start>", "goes on after the end of its document; a file holds one"),
    ("found undefined tag", "has a tag; only plain data is read"),
    ("escape", "has a backslash in double quotes that means nothing; use single quotes"),
)


def in_plain_words(error: yaml.YAMLError, text: str, line: int | None) -> str:
    """What the parser found wrong, as a person would say it."""
    problem = str(getattr(error, "problem", None) or getattr(error, "reason", None) or "")
    if line is not None:
        rows = text.split("\n")
        if "\t" in re.match(r"\s*", rows[line - 1]).group():  # type: ignore[union-attr]  # always matches
            return "is indented with a tab; YAML wants blanks"
    for part, words in _WORDS:
        if part in problem:
            return words
    return f"is not YAML: {problem}" if problem else "is not YAML"
