"""What every part of a lock is made of: the frozen record and the types of its scalars."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Annotated, Any, ClassVar

from pydantic import AfterValidator, BaseModel, BeforeValidator, ConfigDict, Field
from typing_extensions import TypeAliasType

from beforehand.lock.numbers import as_recorded
from beforehand.lock.strings import string_text

# A key of YAML on one line may have 1024 characters as written.
LONGEST_KEY = 1000


class Record(BaseModel):
    """A frozen part of a lock: nothing is coerced, nothing unknown is let in, no number is infinite."""

    # Fields that are not written where they are null.
    left_out: ClassVar[frozenset[str]] = frozenset()

    # Whether every field has a line of its own in a file; else the whole record is one flow line.
    in_blocks: ClassVar[bool] = False

    # Fields that are lists of sentences, one a line; other lists of text stand on one.
    sentences: ClassVar[frozenset[str]] = frozenset()

    model_config = ConfigDict(
        frozen=True, extra="forbid", strict=True, allow_inf_nan=False, populate_by_name=True
    )


def _short_enough(key: str) -> str:
    """Refuse a key that a YAML reader would not take for one."""
    if len(string_text(key)) > LONGEST_KEY:
        raise ValueError(f"a name may have at most {LONGEST_KEY} characters as written")
    return key


def _tuples(value: Any) -> Any:
    """Take plain data with its lists as tuples, so that what is frozen stays so."""
    if isinstance(value, Mapping):
        return {key: _tuples(item) for key, item in value.items()}
    if isinstance(value, list | tuple):
        return tuple(_tuples(item) for item in value)
    # Text of a kind of its own, which remembers how it stood in a file, is text here.
    return str(value) if isinstance(value, str) else value


# A computed number, as it is recorded: to ten digits.
Figure = Annotated[float, AfterValidator(as_recorded)]

Name = Annotated[str, AfterValidator(_short_enough)]
Count = Annotated[int, Field(ge=0)]
Digest = Annotated[str, Field(pattern=r"^sha256:[0-9a-f]{16,64}$")]
FitId = Annotated[str, Field(pattern=r"^F[0-9]{3,}$")]
RulingId = Annotated[str, Field(pattern=r"^R[0-9]{3,}$")]
CheckId = Annotated[str, Field(pattern=r"^C[0-9]{3,}$")]

Scalar = bool | int | Figure | str | None
Plain = TypeAliasType("Plain", "bool | int | float | str | tuple[Plain, ...] | dict[Name, Plain] | None")
PlainData = Annotated[Mapping[Name, Plain], BeforeValidator(_tuples)]
