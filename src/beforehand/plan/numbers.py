"""Numbers as a plan writes them: plain, as shares in percent, within bounds; and how messages show values.

A file hands over ``Plain`` text, whose type is decided by the field; a mapping made in memory hands
over Python numbers. Text in quotes is never a number, but may be a share such as ``"40%"``.
"""

from __future__ import annotations

import math
import re
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from pydantic_core import PydanticCustomError, core_schema

from beforehand.plan.written import Plain

if TYPE_CHECKING:
    from pydantic import GetCoreSchemaHandler, GetJsonSchemaHandler
    from pydantic.json_schema import JsonSchemaValue

NUMBER = re.compile(r"[-+]?(?:\d+(?:\.\d*)?|\.\d+)(?:[eE][-+]?\d+)?")
_PERCENT = re.compile(r"([-+]?(?:\d+(?:\.\d*)?|\.\d+))(?:[eE]([-+]?\d+))?\s*%")

# A number of more characters is a slip or an attack; no double needs so many.
MOST_DIGITS = 400

# How much of a wrong value a message repeats.
_SHOWN = 40


def wrong(code: str, message: str) -> PydanticCustomError:
    """An error that carries its message as it is, braces and all."""
    return PydanticCustomError(code, "{message}", {"message": message})


def shown(value: object) -> str:
    """A wrong value as a message repeats it, cut where it is long."""
    if isinstance(value, dict):
        return "a mapping"
    if isinstance(value, tuple | list):
        return "a list"
    if value is None:
        return "nothing"
    if isinstance(value, bool):
        return str(value).lower()
    text = repr(str(value)) if isinstance(value, str) else str(value)
    return text if len(text) <= _SHOWN else f"{text[:_SHOWN]}…"


def number_text(value: float) -> str:
    """A number for a message: whole ones without a dot."""
    return str(int(value)) if float(value).is_integer() and abs(value) < 1e15 else repr(float(value))


def number_from(value: object, *, percent: bool = False) -> float:
    """A finite number from plain text or a Python number; ``40%`` too where ``percent``."""
    if isinstance(value, str) and percent and len(value) <= MOST_DIGITS:
        found = _PERCENT.fullmatch(value.strip())
        if found:
            # The text is scaled, not the number, so that 0.1% is the double nearest to 0.001.
            return _finite(float(f"{found[1]}e{int(found[2] or 0) - 2}"), value)
    if isinstance(value, Plain) and len(value) <= MOST_DIGITS and NUMBER.fullmatch(value):
        return _finite(float(value), value)
    if isinstance(value, int | float) and not isinstance(value, bool):
        try:
            return _finite(float(value), value)
        except OverflowError:
            raise wrong("number", "is too large a number") from None
    wanted = "a number or a share such as 40%" if percent else "a number"
    quoted = isinstance(value, str) and not isinstance(value, Plain) and NUMBER.fullmatch(value)
    hint = "; take the quotes away" if quoted else ""
    raise wrong("number", f"is {shown(value)}; it must be {wanted}{hint}")


def _finite(number: float, value: object) -> float:
    """The number, unless it is beyond the largest double or no number at all."""
    if not math.isfinite(number):
        raise wrong("number", f"is {shown(value)}; it must be a finite number")
    return number + 0.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Real:
    """A number within bounds; a bound that is None does not bind.

    Attributes
    ----------
    above, at_least, below, at_most : float or None
    percent : bool
        Whether ``5%`` may stand for 0.05.
    """

    above: float | None = None
    at_least: float | None = None
    below: float | None = None
    at_most: float | None = None
    percent: bool = False

    def read(self, value: object) -> float:
        """The number, or a fault that names the bounds."""
        number = number_from(value, percent=self.percent)
        if (
            (self.above is not None and not number > self.above)
            or (self.at_least is not None and not number >= self.at_least)
            or (self.below is not None and not number < self.below)
            or (self.at_most is not None and not number <= self.at_most)
        ):
            raise wrong("bounds", f"is {number_text(number)}; it must {self._bounds()}")
        return number

    def _bounds(self) -> str:
        """What the bounds ask for, in words."""
        low = self.above if self.above is not None else self.at_least
        high = self.below if self.below is not None else self.at_most
        if low is not None and high is not None:
            ends = {
                (True, True): ", both excluded",
                (True, False): f", {number_text(low)} excluded",
                (False, True): f", {number_text(high)} excluded",
                (False, False): "",
            }[self.above is not None, self.below is not None]
            return f"lie between {number_text(low)} and {number_text(high)}{ends}"
        if low is not None:
            return f"be {'above' if self.above is not None else 'at least'} {number_text(low)}"
        return f"be {'below' if self.below is not None else 'at most'} {number_text(high or 0.0)}"

    def __get_pydantic_core_schema__(
        self, source: Any, handler: GetCoreSchemaHandler
    ) -> core_schema.CoreSchema:
        """Read the value here; pydantic's own number types are too forgiving or too strict."""
        return core_schema.no_info_plain_validator_function(self.read)

    def __get_pydantic_json_schema__(
        self, schema: core_schema.CoreSchema, handler: GetJsonSchemaHandler
    ) -> JsonSchemaValue:
        """A number with the bounds, or a percentage as text."""
        number: dict[str, Any] = {"type": "number"}
        bounds = {
            "exclusiveMinimum": self.above,
            "minimum": self.at_least,
            "exclusiveMaximum": self.below,
            "maximum": self.at_most,
        }
        number |= {name: bound for name, bound in bounds.items() if bound is not None}
        if not self.percent:
            return number
        return {"oneOf": [number, {"type": "string", "pattern": r"^[0-9.eE+-]+ ?%$"}]}


@dataclass(frozen=True, slots=True, kw_only=True)
class Whole:
    """A whole number within bounds, both included."""

    at_least: int
    at_most: int

    def read(self, value: object) -> int:
        """The number; ``2e3`` and ``2000.0`` are whole, ``2.5`` is not."""
        number = number_from(value)
        if not number.is_integer():
            raise wrong("number", f"is {shown(value)}; it must be a whole number")
        # The text of a long whole number says more than the nearest double.
        exact = int(number)
        if isinstance(value, int) or (isinstance(value, Plain) and value.lstrip("+-").isdecimal()):
            exact = int(value)
        if not self.at_least <= exact <= self.at_most:
            bounds = f"lie between {self.at_least} and {self.at_most}"
            raise wrong("bounds", f"is {shown(value)}; it must {bounds}")
        return exact

    def __get_pydantic_core_schema__(
        self, source: Any, handler: GetCoreSchemaHandler
    ) -> core_schema.CoreSchema:
        """Read the value here, so that one message covers every slip."""
        return core_schema.no_info_plain_validator_function(self.read)

    def __get_pydantic_json_schema__(
        self, schema: core_schema.CoreSchema, handler: GetJsonSchemaHandler
    ) -> JsonSchemaValue:
        """A whole number with its bounds."""
        return {"type": "integer", "minimum": self.at_least, "maximum": self.at_most}


SHARE = Real(at_least=0.0, at_most=1.0, percent=True)
LEVEL_OF_TEST = Real(above=0.0, below=1.0, percent=True)
POSITIVE = Real(above=0.0)
ANY_NUMBER = Real()
