"""Numbers, shares, p-values and counted nouns as they stand in a sentence."""

from __future__ import annotations

from collections.abc import Mapping

RUNG_WORDS: Mapping[str, str] = {
    "identity": "as it is",
    "square": "squared",
    "cube": "cubed",
    "square_root": "as its square root",
    "cube_root": "as its cube root",
    "log": "as its natural logarithm",
    "reciprocal": "as its reciprocal",
    "box_cox": "under a Box-Cox power",
}

CHECK_WORDS: Mapping[str, str] = {
    "curvature": "the curvature check",
    "breusch_pagan": "the check of equal spread",
    "white": "White's check of equal spread",
    "jarque_bera": "the Jarque-Bera check of normal residuals",
    "shapiro_wilk": "the Shapiro-Wilk check of normal residuals",
    "reset": "the RESET check",
    "breusch_godfrey": "the Breusch-Godfrey check",
    "durbin_watson": "the Durbin-Watson statistic",
}


def number(value: object, digits: int = 3) -> str:
    """A number for a sentence: few digits, no exponent where a person would not write one."""
    if value is None:
        return "not available"
    if isinstance(value, bool) or not isinstance(value, int | float):
        return str(value)
    if isinstance(value, int):
        return f"{value:,}"
    if value == 0:
        return "0"
    if 1e-4 <= abs(value) < 1e6:
        decimals = max(0, digits - 1 - _magnitude(value))
        return f"{value:.{decimals}f}"
    return f"{value:.{digits - 1}e}"


def limit_text(value: object) -> str:
    """A limit as a person wrote it in the plan: 0.05, not 0.0500."""
    return f"{value:.6g}" if isinstance(value, int | float) else "not available"


def p_value(value: object) -> str:
    """A p for a sentence: three decimals, or that it is below a thousandth."""
    if value is None or not isinstance(value, int | float):
        return "not available"
    return "below 0.001" if value < 0.001 else f"{value:.3f}"


def share(value: object) -> str:
    """A share as a percentage."""
    return f"{100 * float(value):.3g} %" if isinstance(value, int | float) else "not available"


def plural(count: object, one: str, many: str | None = None) -> str:
    """A counted noun: ``1 row``, ``2 rows``."""
    number_of = int(count) if isinstance(count, int | float) else 0
    return f"{number_of:,} {one if number_of == 1 else (many or one + 's')}"


def _magnitude(value: float) -> int:
    """The exponent of ten of a number's first digit."""
    return int(f"{value:e}".rsplit("e", 1)[1])
