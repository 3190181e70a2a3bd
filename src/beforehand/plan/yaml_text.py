"""Plain data as YAML that a person reviews: short mappings and lists on one line, long ones in blocks.

Every reader of YAML 1.1 or 1.2 reads the text the same way: what could be taken for anything but text
stands in quotes, and every number with an exponent has a dot and a sign.
"""

from __future__ import annotations

import json
import re
from collections.abc import Mapping
from typing import Any

# A mapping or list up to this many characters stands on one line.
LINE = 110

# Text that stands without quotes anywhere; in prose, which stands in no list, a few signs more.
_BARE = re.compile(r"(?:[^\W\d_]|°)(?:[\w %°²³/.()+-]*[\w%°²³).])?|\d+[*/][\w*/().+-]*[\w)]")
_PROSE = re.compile(r"[^\W\d_][\w %°²³/.()+,;'?!-]*[\w%°²³).?!]")
_BARE_KEY = re.compile(r"[^\W\d]\w*")

# Words that some reader of YAML takes for a truth value or for nothing.
_TAKEN = frozenset({"true", "false", "yes", "no", "on", "off", "y", "n", "null"})

# json leaves these as they are, but YAML readers take them for line ends or refuse them.
_ESCAPED = re.compile("[\x7f-\x9f\u2028\u2029\ufeff\ufffe\uffff]")


def yaml_text(data: Mapping[str, Any]) -> str:
    """Plain data as YAML text with a final line end.

    Parameters
    ----------
    data : mapping
        Of mappings with text keys, lists, text, finite numbers, truth values and None.

    Examples
    --------
    >>> print(yaml_text({"alpha": 0.05, "steps": ["selection"], "title": "no"}), end="")
    alpha: 0.05
    steps: [selection]
    title: "no"
    """
    lines: list[str] = []
    _mapping(data, "", lines)
    return "\n".join(lines) + "\n"


def scalar(value: Any) -> str:
    """One value as YAML."""
    if value is None:
        return "null"
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, int):
        return str(value)
    if isinstance(value, float):
        return _number(value)
    return _text(value, _BARE)


def _number(value: float) -> str:
    """A float, whole ones without a dot, exponents with one and a sign: 1.0e-05."""
    if value.is_integer() and abs(value) < 1e15:
        return str(int(value))
    text = repr(value)
    mantissa, mark, exponent = text.partition("e")
    if not mark:
        return text
    sign = exponent if exponent[0] in "+-" else "+" + exponent
    return f"{mantissa if '.' in mantissa else mantissa + '.0'}e{sign}"


def _text(text: str, bare: re.Pattern[str]) -> str:
    """Text, in double quotes unless every reader takes it for text as it is."""
    if bare.fullmatch(text) and text.casefold() not in _TAKEN:
        return text
    quoted = json.dumps(text, ensure_ascii=False)
    return _ESCAPED.sub(lambda found: f"\\u{ord(found.group()):04x}", quoted)


def _flow(value: Any) -> str:
    """A value on one line."""
    if isinstance(value, Mapping):
        return "{" + ", ".join(f"{_text(key, _BARE_KEY)}: {_flow(item)}" for key, item in value.items()) + "}"
    if isinstance(value, list | tuple):
        return "[" + ", ".join(_flow(item) for item in value) + "]"
    return scalar(value)


def _fits(text: str, indent: str) -> bool:
    """Whether a value stands on one line behind its indentation."""
    return len(indent) + len(text) <= LINE


def _mapping(data: Mapping[str, Any], indent: str, lines: list[str]) -> None:
    """A mapping in block style; what is short stands beside its key."""
    for key, value in data.items():
        name = _text(key, _BARE_KEY)
        if isinstance(value, Mapping) and value and (not indent or not _fits(name + _flow(value), indent)):
            lines.append(f"{indent}{name}:")
            _mapping(value, indent + "  ", lines)
        elif isinstance(value, list | tuple) and value and _in_lines(value, name, indent):
            lines.append(f"{indent}{name}:")
            for item in value:
                _item(item, indent + "  ", lines)
        else:
            prose = isinstance(value, str)
            lines.append(f"{indent}{name}: {_text(value, _PROSE) if prose else _flow(value)}")


def _in_lines(items: list[Any] | tuple[Any, ...], name: str, indent: str) -> bool:
    """Whether a list has one line for each item: mappings always, others when they do not fit."""
    return any(isinstance(item, Mapping) for item in items) or not _fits(f"{name}: {_flow(items)}", indent)


def _item(item: Any, indent: str, lines: list[str]) -> None:
    """One item of a list."""
    text = _flow(item)
    if not isinstance(item, Mapping) or not item or _fits(text, indent + "- "):
        lines.append(f"{indent}- {text}")
        return
    inner: list[str] = []
    _mapping(item, indent + "  ", inner)
    inner[0] = f"{indent}- {inner[0].lstrip()}"
    lines.extend(inner)
