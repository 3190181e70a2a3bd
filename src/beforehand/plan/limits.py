"""Limits that depend on the size of the table, such as ``4/n`` or ``2*sqrt(p/n)``.

The grammar: numbers, ``n`` (rows in use), ``p`` (coefficients with the intercept), ``+ - * /``,
``sqrt`` and brackets.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any, Self

from beforehand.faults import NumericalError
from beforehand.plan.arithmetic import Call, Expression, Name, Negative, Number, Operation, written
from beforehand.plan.parsing import FormulaError, Grammar, parse

if TYPE_CHECKING:
    from pydantic import GetCoreSchemaHandler, GetJsonSchemaHandler
    from pydantic.json_schema import JsonSchemaValue
    from pydantic_core import CoreSchema

GRAMMAR = Grammar(functions={"sqrt": (1, 1)}, names=("n", "p"), powers=False, comparisons=False, quotes=False)

# A table on which any sensible limit has a positive value; a limit that has none is a slip of the pen.
_TRIAL_N, _TRIAL_P = 1000, 7


@dataclass(frozen=True, slots=True)
class Limit:
    """A limit of a measure, as a formula in n and p.

    Attributes
    ----------
    text : str
        The formula in its one normal form: ``4/n``, ``2*sqrt(p/n)``, ``3``.

    Examples
    --------
    >>> Limit.of(" 3 * p / n ").text
    '3*p/n'
    >>> Limit.of("3*p/n").value(n=60, p=4)
    0.2
    """

    text: str
    _expression: Expression = field(repr=False, compare=False)

    @classmethod
    def of(cls, written_limit: str | float) -> Self:
        """Read a limit.

        Parameters
        ----------
        written_limit : str or float
            A formula, or a plain number.

        Raises
        ------
        FormulaError
            When it is not of the grammar, or not above 0 for a table of 1000 rows and 7 coefficients.
        """
        if isinstance(written_limit, str):
            expression = parse(written_limit, GRAMMAR)
        else:
            if not math.isfinite(written_limit):
                raise FormulaError("is not a finite number")
            expression = Number(abs(float(written_limit)))
            expression = Negative(expression) if written_limit < 0 else expression
        limit = cls(written(expression, spaced=False), expression)
        try:
            trial = _value(expression, float(_TRIAL_N), float(_TRIAL_P))
        except ArithmeticError:
            trial = math.nan
        if not 0.0 < trial < math.inf:
            raise FormulaError("is not above 0" if limit.constant is not None else _NOT_POSITIVE)
        return limit

    @property
    def constant(self) -> float | None:
        """The number, where the limit does not depend on n or p and is written as a number."""
        match self._expression:
            case Number(value):
                return value
            case Negative(Number(value)):
                return -value
        return None

    def value(self, n: int, p: int) -> float:
        """The limit for a table of this size.

        Parameters
        ----------
        n, p : int
            Rows in use, and coefficients with the intercept.

        Raises
        ------
        NumericalError
            When the formula has no finite value there, such as ``1/(n - p)`` with n equal to p.
        """
        try:
            found = _value(self._expression, float(n), float(p))
        except ArithmeticError:
            found = math.nan
        if not math.isfinite(found):
            raise NumericalError(f"the limit {self.text} has no value with {n} rows and {p} coefficients")
        return found

    @classmethod
    def __get_pydantic_core_schema__(cls, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        """Read limits in models from a number or a text."""
        from pydantic_core import core_schema

        from beforehand.plan.scalars import limit_from

        return core_schema.no_info_plain_validator_function(
            limit_from,
            serialization=core_schema.plain_serializer_function_ser_schema(
                lambda limit: limit.text if limit.constant is None else limit.constant
            ),
        )

    @classmethod
    def __get_pydantic_json_schema__(
        cls, schema: CoreSchema, handler: GetJsonSchemaHandler
    ) -> JsonSchemaValue:
        """A positive number, or a text in the letters and signs of the grammar."""
        return {
            "oneOf": [
                {"type": "number", "exclusiveMinimum": 0},
                {"type": "string", "pattern": r"^[0-9.eE+*/()np sqrt-]+$", "maxLength": 1000},
            ],
            "examples": ["4/n", "3*p/n", "2*sqrt(p/n)", 3],
        }


_NOT_POSITIVE = f"is not above 0 for a table of {_TRIAL_N} rows and {_TRIAL_P} coefficients"


def _value(expression: Expression, n: float, p: float) -> float:
    """Value of a limit's tree; raises ArithmeticError for a division by 0 or the root of a negative."""
    match expression:
        case Number(value):
            return value
        case Name(text):
            return n if text == "n" else p
        case Negative(operand):
            return -_value(operand, n, p)
        case Call(_, arguments):
            inner = _value(arguments[0], n, p)
            if inner < 0.0:
                raise ArithmeticError("root of a negative number")
            return math.sqrt(inner)
        case Operation(sign, left, right):
            first, second = _value(left, n, p), _value(right, n, p)
            if sign == "+":
                return first + second
            if sign == "-":
                return first - second
            return first * second if sign == "*" else first / second
