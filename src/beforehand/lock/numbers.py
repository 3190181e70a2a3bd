"""The one formatter of numbers in a lock.

A float always shows a dot and, with an exponent, the exponent's sign: readers of YAML 1.1 take
``1e-05`` for text and ``3`` for a count. Counts are the only integers.
"""

from __future__ import annotations

from math import isfinite

# What a run computes is recorded to so many digits: fewer than a double holds, so that what is
# written does not hang on its last bits.
SIGNIFICANT_DIGITS = 10
_TO_TEN_DIGITS = f"%.{SIGNIFICANT_DIGITS}g"


def number_text(value: float) -> str:
    """Write a computed number to 10 significant digits.

    Parameters
    ----------
    value : float
        Any finite number.

    Returns
    -------
    str
        A float to every reader of YAML 1.1, YAML 1.2 and JSON.

    Raises
    ------
    ValueError
        The number is not finite.

    Examples
    --------
    >>> number_text(6.41), number_text(3.0), number_text(1e-5), number_text(-0.0)
    ('6.41', '3.0', '1.0e-05', '0.0')
    """
    return _dotted(_TO_TEN_DIGITS % value, value)


def exact_text(value: float) -> str:
    """Write a number that a person wrote, to as many digits as give the same double back.

    Parameters
    ----------
    value : float
        Any finite number.

    Returns
    -------
    str
        As of `number_text`, with up to 17 digits.

    Raises
    ------
    ValueError
        The number is not finite.
    """
    return _dotted(float.__repr__(value), value)


def as_recorded(value: float) -> float:
    """Round a number to what reads back from a lock."""
    rounded = float(_TO_TEN_DIGITS % value)
    return rounded if isfinite(rounded) else value


def _dotted(text: str, value: float) -> str:
    """Put a dot before any exponent, and take the sign off zero."""
    if "e" in text:
        if not isfinite(float(text)):
            # The largest doubles round up beyond what a double holds; they keep all their digits.
            return float.__repr__(value)
        mantissa, exponent = text.split("e")
        return f"{mantissa}e{exponent}" if "." in mantissa else f"{mantissa}.0e{exponent}"
    if "." in text:
        return "0.0" if text == "-0.0" else text
    if not isfinite(value):
        raise ValueError(f"a lock holds finite numbers only, not {text}")
    return "0.0" if text == "-0" else f"{text}.0"
