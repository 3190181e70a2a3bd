"""Numbers for people: as many digits as mean something, where the record keeps ten."""

from __future__ import annotations

import math
from collections.abc import Sequence

# The standard error is told with two digits; what lies beyond is noise to a reader.
ERROR_DIGITS = 2
# Digits of a number that has no standard error beside it.
PLAIN_DIGITS = 3
# The record keeps no more, however small a standard error is.
RECORDED_DIGITS = 10
# Digits of a coefficient without error, as in an exact fit.
EXACT_DIGITS = 6
# Beyond these a number is written with an exponent.
# A share below this is what rounding leaves of a 0, such as the R² of a mean.
DUST = 1e-12
LARGEST_PLAIN = 1e7
SMALLEST_POWER = -4
MOST_DECIMALS = 6


def trimmed(value: float, digits: int = PLAIN_DIGITS) -> str:
    """Tell a number that a person wrote, without zeros that were not written: ``0.05``."""
    text = figure(value, digits)
    return text.rstrip("0").rstrip(".") if "." in text and "e" not in text else text


def magnitude(value: float) -> int:
    """Power of ten of the first digit; 0 for 0."""
    return int(f"{abs(value):e}".rsplit("e", 1)[1]) if value else 0


def figure(value: float | None, digits: int = PLAIN_DIGITS) -> str:
    """A number with ``digits`` significant digits, whole parts never rounded away."""
    if value is None:
        return "none"
    if value == 0:
        return "0"
    power = magnitude(value)
    if abs(value) >= LARGEST_PLAIN or power < SMALLEST_POWER:
        return f"{value:.{digits - 1}e}"
    return _fixed(value, max(0, digits - 1 - power))


def decimals_beside(error: float | None) -> int | None:
    """Decimals that a number deserves beside its standard error; None where an exponent is due."""
    if error is None or error <= 0 or not math.isfinite(error):
        return None
    decimals = max(0, ERROR_DIGITS - 1 - magnitude(error))
    return decimals if decimals <= MOST_DECIMALS else None


def beside(values: Sequence[float | None], error: float | None) -> tuple[str, ...]:
    """Numbers told as exactly as their common standard error allows: ``6.41`` beside ``0.61``."""
    known = [value for value in values if value is not None]
    largest = max((abs(value) for value in known), default=0.0)
    decimals = decimals_beside(error)
    if decimals is not None and largest < LARGEST_PLAIN:
        decimals = max(0, min(decimals, RECORDED_DIGITS - 1 - magnitude(largest)))
        return tuple("none" if value is None else _fixed(value, decimals) for value in values)
    if error is None or error <= 0 or not math.isfinite(error):
        return tuple("none" if value is None else trimmed(value, EXACT_DIGITS) for value in values)
    last = magnitude(error) - ERROR_DIGITS + 1
    return tuple(
        "none" if value is None else figure(value, max(1, min(RECORDED_DIGITS, magnitude(value) - last + 1)))
        for value in values
    )


def p_text(p: float | None, limit: float | None = None) -> str:
    """A p with three decimals, ``<0.001`` below; more where rounding would cross ``limit``."""
    if p is None:
        return "none"
    if p < 0.001:
        return "<0.001" if limit is None or limit > 0.001 else f"{p:.1e}"
    for decimals in range(3, 8):
        text = f"{p:.{decimals}f}"
        if limit is None or p == limit or (float(text) > limit) == (p > limit):
            return text
    return f"{p:.10g}"


def p_phrase(p: float | None, limit: float | None = None) -> str:
    """A p within a sentence: ``p 0.412`` or ``p below 0.001``."""
    text = p_text(p, limit)
    return f"p {text.replace('<', 'below ')}" if p is not None else "no p"


def percent(value: float) -> str:
    """A share as a percentage with at most one decimal: ``81.2 %``; dust of rounding is 0."""
    value = 0.0 if abs(value) < DUST else value
    text = f"{100 * value:.1f}"
    if text in ("100.0", "0.0") and value not in (0.0, 1.0):
        text = f"{100 * value:.3g}" if text == "0.0" else "more than 99.9"
    return f"{text.removesuffix('.0')} %"


def count(number: int, one: str, many: str | None = None) -> str:
    """A counted noun: ``1 row``, ``1,200 rows``."""
    return f"{number:,} {one if number == 1 else many or one + 's'}"


def listed(names: Sequence[str], most: int | None = None) -> str:
    """Names in a sentence: ``a, b and c``, or ``a, b and 7 more`` beyond ``most``."""
    if most is not None and len(names) > most:
        return ", ".join(names[:most]) + f" and {len(names) - most:,} more"
    if len(names) < 2:
        return "".join(names)
    return ", ".join(names[:-1]) + " and " + names[-1]


def _fixed(value: float, decimals: int) -> str:
    """A number with so many decimals; a zero has no sign."""
    text = f"{value:.{decimals}f}"
    return text[1:] if text.startswith("-") and not text.strip("-0.") else text
