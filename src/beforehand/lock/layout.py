"""The layout of a lock line by line, turned into JSON.

A lock uses a small part of YAML: block mappings and lists by two blanks a level, flow values that
end on their line, text plain or in double quotes with JSON's escapes. In that part, text turns into
JSON by quoting what is plain, which is many times faster than a general reader on a large lock.
Nothing here judges: what is read is written again and must give the same bytes.
"""

from __future__ import annotations

import re
from collections.abc import Iterable

from beforehand.lock.strings import PLAIN_PATTERN

# Deeper than any record of ours with the deepest plan that can be read.
DEEPEST = 60

_QUOTED = r'"(?:[^"\\]|\\.)*"'
_KEY = re.compile(rf"({PLAIN_PATTERN}|{_QUOTED}):(?: (.+))?")
_PIECES = re.compile(f"({_QUOTED})")
# A word in a flow value: what follows a number's digits is no word, nor are JSON's own three.
_WORD = re.compile(rf"(?<![\w.+-])(?!(?:null|true|false)(?:[,}}\]]|$)){PLAIN_PATTERN}")

_NUMBER_BEGINS = frozenset("-0123456789")
_JSON_WORDS = frozenset({"null", "true", "false"})


class LayoutError(Exception):
    """A line is not in the layout of a lock; carries its number from 1 and what is wrong."""

    def __init__(self, line: int, what: str) -> None:
        self.line = line
        self.what = what
        super().__init__(f"line {line}: {what}")


def json_of(lines: Iterable[str], first_line: int = 1) -> str:
    """Turn lines in the layout of a lock into JSON.

    Parameters
    ----------
    lines : iterable of str
        Lines without their line ends.
    first_line : int
        Number of the first of them in its file.

    Returns
    -------
    str
        What should be JSON, line for line; it is not checked.

    Raises
    ------
    LayoutError
        A line has no place in a lock.
    """
    out: list[str] = []
    # Open collections by indent, the outermost first, with what closes each.
    indents = [-2]
    closing = [""]
    # After a key without a value, the next line must open the value.
    awaits = True
    for number, line in enumerate(lines, first_line):
        content = line.lstrip(" ")
        indent = len(line) - len(content)
        item = content.startswith("- ")
        # One line of JSON for one of the file, so that what a parser says has its line.
        out.append("\n" if out else "")
        if awaits:
            if indent != indents[-1] + 2:
                raise LayoutError(number, "it should be indented by two blanks under its key")
            if len(indents) > DEEPEST:
                raise LayoutError(number, "it is nested too deeply")
            indents.append(indent)
            closing.append("]" if item else "}")
            out.append("[" if item else "{")
        else:
            while indents[-1] > indent:
                indents.pop()
                out.append(closing.pop())
            if indents[-1] != indent or (closing[-1] == "]") is not item:
                raise LayoutError(number, "its indent fits no line above")
            out.append(",")
        awaits = False
        if item:
            content = content[2:]
            if content[:1] in "{[" or not (entry := _KEY.fullmatch(content)):
                out.append(_flow_json(content))
                continue
            indents.append(indent + 2)
            closing.append("}")
            out.append("{")
        elif not (entry := _KEY.fullmatch(content)):
            raise LayoutError(number, "it is neither 'key: value' nor '- item'")
        key, value = entry.groups()
        out.append(f"{key}:" if key[0] == '"' else f'"{key}":')
        if value is None:
            awaits = True
        else:
            out.append(_flow_json(value))
    if awaits:
        raise LayoutError(number if out else first_line, "a value should follow it")
    return "".join(out) + "".join(reversed(closing))


def _flow_json(text: str) -> str:
    """Turn a value on one line into JSON."""
    if '"' not in text:
        # Most lines of a lock are flat mappings of names, words and numbers: they need no search.
        if text[0] == "{" and text[-1] == "}" and text.count("{") == 1 and "[" not in text and len(text) > 2:
            return "{" + ",".join([_entry_json(entry) for entry in text[1:-1].split(", ")]) + "}"
        return _WORD.sub(r'"\g<0>"', text)
    pieces = _PIECES.split(text)
    pieces[::2] = [_WORD.sub(r'"\g<0>"', piece) for piece in pieces[::2]]
    return "".join(pieces)


def _entry_json(entry: str) -> str:
    """Turn one entry of a flat mapping into JSON."""
    key, _, value = entry.partition(": ")
    if value[:1] in _NUMBER_BEGINS or value in _JSON_WORDS:
        return f'"{key}":{value}'
    return f'"{key}":"{value}"'
