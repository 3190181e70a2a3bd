"""What every block of a plan is: frozen, strict, closed to unknown keys."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any, ClassVar, Self, TypeVar, cast

from pydantic import BaseModel, ConfigDict, Discriminator

from beforehand.faults import nearest
from beforehand.plan.written import FrozenMapping

Item = TypeVar("Item")

# Starts the tag of a union's branch. No key of a file can hold it, so that tags can be told from keys
# in the location of an error.
TAG = "\x1f"


class Block(BaseModel):
    """A block of the plan.

    Attributes
    ----------
    words : tuple of str
        Fields that no number and no ruling depends on; outside the digest of the decisions.
    unordered : tuple of str
        Lists whose order means nothing.
    left_out : tuple of str
        Fields that the written-out plan leaves out where they are empty.
    """

    words: ClassVar[tuple[str, ...]] = ()
    unordered: ClassVar[tuple[str, ...]] = ()
    left_out: ClassVar[tuple[str, ...]] = ()

    # Building the validators takes as long as all imports together, so it waits for the first plan.
    model_config = ConfigDict(frozen=True, extra="forbid", strict=True, allow_inf_nan=False, defer_build=True)

    @classmethod
    def defaults(cls) -> Self:
        """The block with every default, made without building its validator."""
        return cast(Self, cls.model_construct())


def frozen(items: Mapping[str, Item]) -> Mapping[str, Item]:
    """The mapping in a form that cannot change, in the order of its names."""
    return FrozenMapping(items)


def by_shape(word: str | None, *models: tuple[type[Block], str]) -> Discriminator:
    """Choose the branch of a union by what is written, so that a fault names one branch only.

    Parameters
    ----------
    word : str or None
        Tag for anything that is not a mapping; None where only mappings are expected.
    models : pairs of model and key
        The first model whose key, or a near one, stands in the mapping is meant; else the last.
    """

    def choose(value: Any) -> str:
        for model, _ in models:
            if isinstance(value, model):
                return tag_of(model)
        if word is not None and not isinstance(value, Mapping):
            return word
        keys = [key for _, key in models]
        for written in value if isinstance(value, Mapping) and len(models) > 1 else ():
            meant = written if written in keys else nearest(str(written), keys)
            if meant is not None:
                return tag_of(models[keys.index(meant)][0])
        return tag_of(models[-1][0])

    return Discriminator(choose)


def tag_of(model: type[Block]) -> str:
    """The tag of a model as a branch of a union."""
    return TAG + model.__name__


WORD_TAG = TAG + "word"
