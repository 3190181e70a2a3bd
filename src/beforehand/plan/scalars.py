"""The kinds of single values that a plan holds, and how each is read from what was written.

A file hands over ``Plain`` text, whose type is decided here, by the field; a mapping made in memory
hands over Python values, which must be of the right type already. Messages are whole sentences after
the place: ``alpha: is 1.2; it must lie between 0 and 1``.
"""

from __future__ import annotations

import codecs
import datetime
from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, Literal, get_args

from pydantic_core import PydanticCustomError, core_schema

from beforehand.faults import did_you_mean
from beforehand.plan.limits import Limit
from beforehand.plan.numbers import NUMBER, number_from, number_text, shown, wrong
from beforehand.plan.parsing import FormulaError
from beforehand.plan.written import FrozenMapping, Plain

if TYPE_CHECKING:
    from pydantic import GetCoreSchemaHandler, GetJsonSchemaHandler
    from pydantic.json_schema import JsonSchemaValue


@dataclass(frozen=True, slots=True, kw_only=True)
class Text:
    """Text, whatever it looks like: ``no``, ``2024`` and ``2026-12-01`` are text here.

    Attributes
    ----------
    empty : bool
        Whether it may be empty.
    one_line : bool
        Whether it is a name, which stands on one line.
    looks : tuple of str
        JSON types that an editor may take the unquoted text for.
    """

    empty: bool = False
    one_line: bool = False
    looks: tuple[str, ...] = ("string",)

    def read(self, value: object) -> str:
        """The text as a plain ``str``."""
        if value is None:
            raise wrong("text", 'is empty; it must be text (the word null stands in quotes: "null")')
        if not isinstance(value, str):
            hint = "" if isinstance(value, dict | tuple | list) else " (write it in quotes)"
            raise wrong("text", f"is {shown(value)}; it must be text{hint}")
        if not value.strip() and not self.empty:
            raise wrong("text", "is empty; it must be text")
        if self.one_line and ("\n" in value or "\r" in value):
            raise wrong("text", "runs over more than one line; a name stands on one")
        return str(value)

    def __get_pydantic_core_schema__(
        self, source: Any, handler: GetCoreSchemaHandler
    ) -> core_schema.CoreSchema:
        """Read the value here; pydantic would refuse what the file left without quotes."""
        return core_schema.no_info_plain_validator_function(self.read)

    def __get_pydantic_json_schema__(
        self, schema: core_schema.CoreSchema, handler: GetJsonSchemaHandler
    ) -> JsonSchemaValue:
        """A text, with what editors may take it for."""
        kinds: Any = self.looks[0] if len(self.looks) == 1 else list(self.looks)
        return {"type": kinds} if self.empty else {"type": kinds, "minLength": 1}


@dataclass(frozen=True, slots=True)
class Word:
    """One of the words of a ``Literal``; says which is nearest to a wrong one.

    Attributes
    ----------
    otherwise : str
        What may stand there instead of a word, for the message.
    """

    otherwise: str = ""

    def __get_pydantic_core_schema__(
        self, source: Any, handler: GetCoreSchemaHandler
    ) -> core_schema.CoreSchema:
        """The literal's own schema behind a reader with the better message."""
        words: tuple[str, ...] = get_args(source)
        *first, last = (*words, self.otherwise) if self.otherwise else words
        listed = f"{', '.join(first)} or {last}" if first else last

        def read(value: object) -> str:
            if isinstance(value, str) and str(value) in words:
                return str(value)
            near = did_you_mean(value, words) if isinstance(value, str) and len(words) > 1 else ""
            raise wrong("word", f"is {shown(value)}; it must be {listed}{near}")

        return core_schema.no_info_before_validator_function(read, handler(source))


class Truth:
    """``true`` or ``false``, and no other way to say it."""

    __slots__ = ()

    @staticmethod
    def read(value: object) -> bool:
        """The truth value."""
        if isinstance(value, bool):
            return value
        if isinstance(value, Plain) and value in ("true", "false"):
            return value == "true"
        raise wrong("truth", f"is {shown(value)}; it must be true or false")

    def __get_pydantic_core_schema__(
        self, source: Any, handler: GetCoreSchemaHandler
    ) -> core_schema.CoreSchema:
        """The strict type behind the reader."""
        return core_schema.no_info_before_validator_function(self.read, core_schema.bool_schema(strict=True))


class Cell:
    """What a cell of the table may be compared with: a number, or text.

    Without quotes, what reads as a number is one and all else is text; in quotes it is text.
    """

    __slots__ = ()

    @staticmethod
    def read(value: object) -> float | str:
        """The number or the text."""
        if isinstance(value, Plain):
            return number_from(value) if NUMBER.fullmatch(value) else str(value)
        if isinstance(value, str):
            return value
        if isinstance(value, int | float) and not isinstance(value, bool):
            return number_from(value)
        raise wrong("cell", f"is {shown(value)}; it must be a number or text")

    def __get_pydantic_core_schema__(
        self, source: Any, handler: GetCoreSchemaHandler
    ) -> core_schema.CoreSchema:
        """Read the value here."""
        return core_schema.no_info_plain_validator_function(self.read)

    def __get_pydantic_json_schema__(
        self, schema: core_schema.CoreSchema, handler: GetJsonSchemaHandler
    ) -> JsonSchemaValue:
        """A number or text; unquoted truth values are text."""
        return {"type": ["string", "number", "boolean"]}


class Bound:
    """An end of what is eligible: a number, or a date ``2026-12-01`` compared as text."""

    __slots__ = ()

    @staticmethod
    def read(value: object) -> float | str:
        """The number, or the ISO date as text."""
        if isinstance(value, str) and len(value) == len("2026-12-01"):
            try:
                return datetime.date.fromisoformat(str(value)).isoformat()
            except ValueError:
                pass
        if isinstance(value, str) and not (isinstance(value, Plain) and NUMBER.fullmatch(value)):
            raise wrong("bound", f"is {shown(value)}; it must be a number or a date such as 2026-12-01")
        return number_from(value)

    def __get_pydantic_core_schema__(
        self, source: Any, handler: GetCoreSchemaHandler
    ) -> core_schema.CoreSchema:
        """Read the value here."""
        return core_schema.no_info_plain_validator_function(self.read)

    def __get_pydantic_json_schema__(
        self, schema: core_schema.CoreSchema, handler: GetJsonSchemaHandler
    ) -> JsonSchemaValue:
        """A number or a date."""
        return {"oneOf": [{"type": "number"}, {"type": "string", "pattern": r"^\d{4}-\d\d-\d\d$"}]}


class Interval:
    """``[low, high]``; either end may be null where ``open_ended``."""

    __slots__ = ("_open_ended",)

    def __init__(self, *, open_ended: bool) -> None:
        self._open_ended = open_ended

    def read(self, value: object) -> tuple[float | None, float | None]:
        """The two ends, the lower first."""
        if not isinstance(value, tuple) or len(value) != 2:
            raise wrong("interval", f"is {_counted(value)}; it must be two numbers, [low, high]")
        low, high = (None if end is None and self._open_ended else number_from(end) for end in value)
        if low is not None and high is not None and not low < high:
            raise wrong(
                "interval", f"runs from {number_text(low)} to {number_text(high)}; the lower end comes first"
            )
        if low is None and high is None:
            raise wrong("interval", "has no end that binds; leave it out")
        return low, high

    def __get_pydantic_core_schema__(
        self, source: Any, handler: GetCoreSchemaHandler
    ) -> core_schema.CoreSchema:
        """Read the pair as one value, so that a fault names the pair."""
        return core_schema.no_info_plain_validator_function(self.read)

    def __get_pydantic_json_schema__(
        self, schema: core_schema.CoreSchema, handler: GetJsonSchemaHandler
    ) -> JsonSchemaValue:
        """Two numbers."""
        end: dict[str, Any] = {"type": ["number", "null"] if self._open_ended else "number"}
        return {"type": "array", "items": end, "minItems": 2, "maxItems": 2}


class Pair:
    """Two names, ``[outdoor_temp, load]``; or one name too where ``or_one``."""

    __slots__ = ("_or_one",)

    def __init__(self, *, or_one: bool = False) -> None:
        self._or_one = or_one

    def read(self, value: object) -> str | tuple[str, str]:
        """The name or names."""
        if self._or_one and isinstance(value, str):
            return NAME.read(value)
        wanted = (
            "a predictor, or two for their product" if self._or_one else "two predictors, [first, second]"
        )
        if not isinstance(value, tuple) or len(value) != 2:
            raise wrong("pair", f"is {_counted(value)}; it must be {wanted}")
        first, second = (NAME.read(name) for name in value)
        return first, second

    def __get_pydantic_core_schema__(
        self, source: Any, handler: GetCoreSchemaHandler
    ) -> core_schema.CoreSchema:
        """Read the pair as one value."""
        return core_schema.no_info_plain_validator_function(self.read)

    def __get_pydantic_json_schema__(
        self, schema: core_schema.CoreSchema, handler: GetJsonSchemaHandler
    ) -> JsonSchemaValue:
        """Two names, or one of them."""
        name = {"type": "string", "minLength": 1}
        pair = {"type": "array", "items": name, "minItems": 2, "maxItems": 2}
        return {"oneOf": [name, pair]} if self._or_one else pair


class Slope:
    """An effect: a number for a number, or ``{level: difference}`` for a category."""

    __slots__ = ()

    @staticmethod
    def read(value: object) -> float | Mapping[str, float]:
        """The number, or the mapping of levels to numbers."""
        if not isinstance(value, Mapping):
            return _effect(value, "is", "a number, or of a category numbers by level, {level: number}")
        if not value:
            raise wrong("slope", "names no level; give each level its difference from the baseline")
        return FrozenMapping(
            {level: _effect(item, f"gives {level!r}", "a number") for level, item in value.items()}
        )

    def __get_pydantic_core_schema__(
        self, source: Any, handler: GetCoreSchemaHandler
    ) -> core_schema.CoreSchema:
        """Read the value here."""
        return core_schema.no_info_plain_validator_function(self.read)

    def __get_pydantic_json_schema__(
        self, schema: core_schema.CoreSchema, handler: GetJsonSchemaHandler
    ) -> JsonSchemaValue:
        """A number, or numbers by level."""
        levels = {"type": "object", "minProperties": 1, "additionalProperties": {"type": "number"}}
        return {"oneOf": [{"type": "number"}, levels]}


class Day:
    """A calendar date, ``2026-12-01``."""

    __slots__ = ()

    @staticmethod
    def read(value: object) -> datetime.date:
        """The date."""
        if isinstance(value, datetime.date) and not isinstance(value, datetime.datetime):
            return value
        if isinstance(value, str) and len(value) == len("2026-12-01"):
            try:
                return datetime.date.fromisoformat(str(value))
            except ValueError:
                pass
        raise wrong("date", f"is {shown(value)}; it must be a date such as 2026-12-01")

    def __get_pydantic_core_schema__(
        self, source: Any, handler: GetCoreSchemaHandler
    ) -> core_schema.CoreSchema:
        """Read the date here, without times or guesses."""
        return core_schema.no_info_plain_validator_function(self.read)

    def __get_pydantic_json_schema__(
        self, schema: core_schema.CoreSchema, handler: GetJsonSchemaHandler
    ) -> JsonSchemaValue:
        """A date as text."""
        return {"type": "string", "format": "date"}


def _effect(value: object, start: str, wanted: str) -> float:
    """The number of one effect, or a fault that begins and ends as said."""
    if isinstance(value, Mapping | tuple | list) or value is None or isinstance(value, bool):
        raise wrong("slope", f"{start} {shown(value)}; it must be {wanted}")
    try:
        return number_from(value)
    except PydanticCustomError:
        raise wrong("slope", f"{start} {shown(value)}; it must be {wanted}") from None


def limit_from(value: object) -> Limit:
    """A limit from a number or a formula."""
    if isinstance(value, Limit):
        return value
    if isinstance(value, bool) or not isinstance(value, str | int | float):
        raise wrong("limit", f"is {shown(value)}; it must be a number or a formula such as 4/n")
    try:
        return Limit.of(value if isinstance(value, str) else number_from(value))
    except FormulaError as fault:
        raise wrong("limit", f"{fault} (a limit is a number or a formula in n and p, such as 4/n)") from None


def encoding_from(value: object) -> str:
    """A text encoding that this program can read."""
    name = TEXT.read(value)
    try:
        "".encode(name)
    except (LookupError, ValueError):
        raise wrong("encoding", f"is {shown(name)}; it must be a text encoding such as utf-8") from None
    return codecs.lookup(name).name


def _counted(value: object) -> str:
    """A wrong pair for a message."""
    if isinstance(value, tuple | list):
        return f"a list of {len(value)}"
    return shown(value)


TEXT = Text()
LINE = Text(one_line=True)
NAME = Text(one_line=True, looks=("string", "number"))
LEVEL = Text(one_line=True, looks=("string", "number", "boolean"))
CODE = Text(empty=True, one_line=True, looks=("string", "number", "boolean"))
WORD = Word()
TRUTH = Truth()


Rung = Literal["square", "cube", "square_root", "cube_root", "log", "reciprocal", "box_cox"]
