"""Estimates with their Monte Carlo errors as they stand on a screen."""

from __future__ import annotations

from typing import TYPE_CHECKING

from beforehand.screen.digits import figure, magnitude

if TYPE_CHECKING:
    from beforehand.rehearsing.figures import Estimate

# More decimals of a percentage than so many tell a person nothing.
MOST_DECIMALS = 3
# Digits of a number whose error is nothing or not known.
PLAIN_DIGITS = 3


def percent_text(share: Estimate | None, *, bracketed: bool = False) -> str:
    """A share as ``4.8 % ± 0.5``, or ``4.8 % (± 0.5 %)`` for a sentence that stands alone.

    The error is told to one digit and the share as far as the error goes.
    """
    if share is None:
        return "none"
    value, error = 100 * share.value, share.mc_error
    if not error:
        return f"{figure(value, PLAIN_DIGITS).removesuffix('.00')} %"
    decimals = _decimals(100 * error, MOST_DECIMALS)
    told, off = f"{_signed(f'{value:.{decimals}f}')} %", f"{100 * error:.{decimals}f}"
    return f"{told} (± {off} %)" if bracketed else f"{told} ± {off}"


def number_text(estimate: Estimate | None) -> str:
    """A number as ``1.31 ± 0.04``, told as far as its error goes."""
    if estimate is None:
        return "none"
    if not estimate.mc_error:
        return figure(estimate.value, PLAIN_DIGITS)
    if magnitude(estimate.mc_error) < -6:
        return f"{figure(estimate.value, 6)} ± {estimate.mc_error:.0e}"
    decimals = _decimals(estimate.mc_error, 6)
    value = _signed(f"{estimate.value:,.{decimals}f}")
    return f"{value} ± {estimate.mc_error:,.{decimals}f}"


def _signed(number: str) -> str:
    """A number whose digits are all 0 without its sign."""
    return number if number.strip("-0.,") else number.removeprefix("-")


def _decimals(error: float, most: int) -> int:
    """Decimals that show one digit of an error."""
    power = magnitude(float(f"{error:.0e}"))
    return min(most, max(0, -power))
