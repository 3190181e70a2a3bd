"""How text is written in a lock: plain where no reader could take it for anything else.

What is not plain stands in double quotes with escapes that YAML and JSON share, on one line.
"""

from __future__ import annotations

import re
from functools import lru_cache

# A letter first, then characters without a meaning in YAML; no blank at the end, nor two in a row
# that an editor might fold. Kept narrow on purpose: in doubt, text is quoted.
PLAIN_PATTERN = r"[^\W\d](?:[\w.\-/()%=+*'×°²−]| (?=[\w.\-/()%=+*'×°²−]))*"

# What readers of YAML 1.1 or 1.2 take for a truth value or for nothing, in whatever case.
WORDS_WITH_A_MEANING = frozenset({"null", "true", "false", "yes", "no", "on", "off", "y", "n"})

_PLAIN = re.compile(PLAIN_PATTERN)
_ESCAPED = re.compile('["\\\\\x00-\x1f\x7f-\x9f\u2028\u2029\ufeff\ufffe\uffff]')
_SHORT_ESCAPES = {'"': '\\"', "\\": "\\\\", "\n": "\\n", "\t": "\\t", "\r": "\\r"}

# Names recur in every fit of a lock; sentences do not, and a large lock has many.
_REMEMBERED = 8192


@lru_cache(maxsize=_REMEMBERED)
def string_text(value: str) -> str:
    """Write text as it stands in a lock.

    Parameters
    ----------
    value : str
        Any text without lone surrogates.

    Returns
    -------
    str
        The same text plain or in double quotes, without a line break.

    Examples
    --------
    >>> print(string_text("fan_hours"), string_text("no"), string_text("load leaves: p 0.4"))
    fan_hours "no" "load leaves: p 0.4"
    """
    if _PLAIN.fullmatch(value) and value.casefold() not in WORDS_WITH_A_MEANING:
        return value
    return f'"{_ESCAPED.sub(_escape, value)}"'


def _escape(found: re.Match[str]) -> str:
    """Escape one character, the same way in YAML and JSON."""
    character = found.group()
    return _SHORT_ESCAPES.get(character) or f"\\u{ord(character):04x}"
