"""The formulas of derived columns: parsed to a frozen tree, evaluated column by column.

The grammar: numbers, columns, ``+ - * / ^``, brackets, ``log sqrt abs min max`` and the comparisons
``< <= > >= == !=``, which give 1 or 0. A column whose name holds blanks or signs stands in single
quotes, a quote inside it doubled: ``'set point (°C)' - outdoor_temp``.
"""

from __future__ import annotations

import functools
import math
from collections.abc import Callable, Mapping
from typing import TYPE_CHECKING

from beforehand.plan.arithmetic import Call, Expression, Name, Negative, Number, Operation, written
from beforehand.plan.numbers import wrong
from beforehand.plan.parsing import FormulaError, Grammar, parse
from beforehand.plan.scalars import TEXT

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray

    FloatArray = NDArray[np.float64]
    Elementwise = Callable[..., FloatArray]

GRAMMAR = Grammar(
    functions={"log": (1, 1), "sqrt": (1, 1), "abs": (1, 1), "min": (2, 1000), "max": (2, 1000)}
)

# Whole exponents up to this are multiplied out, which rounds the same way on every machine.
_MULTIPLIED_OUT = 64


@functools.lru_cache(maxsize=1024)
def parse_formula(text: str) -> Expression:
    """Parse the formula of a derived column.

    Raises
    ------
    FormulaError
        When the text is not of the grammar; the message has no place of its own.

    Examples
    --------
    >>> from beforehand.plan import names_in
    >>> names_in(parse_formula("log(load) - 'set point'"))
    ('load', 'set point')
    """
    return parse(text, GRAMMAR)


def formula_from(value: object) -> str:
    """The one normal text of a written formula: blanks and needless brackets change nothing."""
    text = TEXT.read(value)
    try:
        return written(parse_formula(text))
    except FormulaError as fault:
        raise wrong("formula", str(fault)) from None


def evaluate(expression: Expression, columns: Mapping[str, FloatArray]) -> FloatArray:
    """Values of a formula, row by row.

    Parameters
    ----------
    expression : Expression
        From ``parse_formula``.
    columns : mapping of str to FloatArray
        Every column that the formula names, shape ``(n,)`` each, NaN where a cell is missing.

    Returns
    -------
    FloatArray
        Shape ``(n,)``, or ``()`` for a formula without columns. NaN where a cell it needs is missing
        and where it has no finite value: a division by 0, a logarithm of what is not above 0, a root
        of a negative number, a number beyond the largest double.
    """
    import numpy as np

    with np.errstate(all="ignore"):
        return _finite(_evaluate(expression, columns))


def _finite(values: FloatArray) -> FloatArray:
    """The values with NaN for what is not finite."""
    import numpy as np

    return np.where(np.isfinite(values), values, np.nan)


def _evaluate(expression: Expression, columns: Mapping[str, FloatArray]) -> FloatArray:
    """Values of a subtree; every step turns what is not finite into a missing cell."""
    import numpy as np

    match expression:
        case Number(value):
            return np.asarray(value, dtype=np.float64)
        case Name(text):
            return columns[text]
        case Negative(operand):
            return -_evaluate(operand, columns)
        case Call("log", (argument,)):
            return _each(math.log, _missing_unless(np.greater, _evaluate(argument, columns)))
        case Call("sqrt", (argument,)):
            return np.sqrt(_missing_unless(np.greater_equal, _evaluate(argument, columns)))
        case Call("abs", (argument,)):
            return np.abs(_evaluate(argument, columns))
        case Call(function, arguments):
            choose = np.minimum if function == "min" else np.maximum
            return functools.reduce(choose, [_evaluate(argument, columns) for argument in arguments])
        case Operation("^", base, Number(value)) if value.is_integer() and value <= _MULTIPLIED_OUT:
            return _finite(_multiplied_out(_evaluate(base, columns), int(value)))
        case Operation("^", base, Negative(Number(value))) if value.is_integer() and value <= _MULTIPLIED_OUT:
            return _finite(1.0 / _multiplied_out(_evaluate(base, columns), int(value)))
        case Operation("^", base, exponent):
            return _power(_evaluate(base, columns), _evaluate(exponent, columns))
        case Operation(sign, left, right):
            return _operation(sign, _evaluate(left, columns), _evaluate(right, columns))


def _operation(sign: str, left: FloatArray, right: FloatArray) -> FloatArray:
    """A sum, product, quotient or comparison; a missing operand makes it missing."""
    import numpy as np

    arithmetic: dict[str, Elementwise] = {
        "+": np.add, "-": np.subtract, "*": np.multiply, "/": np.divide,
    }  # fmt: skip
    if sign in arithmetic:
        return _finite(arithmetic[sign](left, right))
    comparisons = {
        "<": np.less, "<=": np.less_equal, ">": np.greater, ">=": np.greater_equal,
        "==": np.equal, "!=": np.not_equal,
    }  # fmt: skip
    answer = comparisons[sign](left, right).astype(np.float64)
    return np.where(np.isnan(left) | np.isnan(right), np.nan, answer)


def _missing_unless(test: Elementwise, values: FloatArray) -> FloatArray:
    """The values that pass a comparison with 0; the others missing."""
    import numpy as np

    return np.where(test(values, 0.0), values, np.nan)


def _each(function: Callable[[float], float], values: FloatArray) -> FloatArray:
    """A function of the standard library on every cell: numpy's own varies with the processor."""
    import numpy as np

    flat = [function(cell) for cell in values.ravel().tolist()]
    return np.array(flat, dtype=np.float64).reshape(values.shape)


def _multiplied_out(base: FloatArray, exponent: int) -> FloatArray:
    """A whole power by repeated squaring; anything to the power 0 is 1, a missing cell stays missing."""
    import numpy as np

    result = np.where(np.isnan(base), np.nan, 1.0)
    square = base
    while exponent:
        if exponent % 2:
            result = result * square
        exponent //= 2
        if exponent:
            square = square * square
    return result


def _power(base: FloatArray, exponent: FloatArray) -> FloatArray:
    """Any power; missing where it has no real, finite value."""
    import numpy as np

    wide_base, wide_exponent = np.broadcast_arrays(base, exponent)
    cells = zip(wide_base.ravel().tolist(), wide_exponent.ravel().tolist(), strict=True)
    flat = [_real_power(x, y) for x, y in cells]
    return np.array(flat, dtype=np.float64).reshape(wide_base.shape)


def _real_power(base: float, exponent: float) -> float:
    """One power, NaN where there is none."""
    if math.isnan(base) or math.isnan(exponent):
        return math.nan
    try:
        return math.pow(base, exponent)
    except (ValueError, OverflowError):
        return math.nan
