"""The rulings of two runs side by side: which flipped, and the first at which their paths part."""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable, Hashable, Sequence
from dataclasses import dataclass

from beforehand.lock import RulingRecord


@dataclass(frozen=True, slots=True, kw_only=True)
class RulingPair:
    """One decision in two runs.

    Attributes
    ----------
    old, new : RulingRecord or None
        None on the side that did not have to decide it.
    """

    old: RulingRecord | None
    new: RulingRecord | None

    @property
    def either(self) -> RulingRecord:
        """The ruling of the side that has one, the old one first."""
        found = self.old if self.old is not None else self.new
        if found is None:
            raise ValueError("a pair of rulings has at least one")
        return found


def flipped(old: Sequence[RulingRecord], new: Sequence[RulingRecord]) -> tuple[RulingPair, ...]:
    """Decisions that both runs made and of which the verdict differs, in the order of the old run.

    Parameters
    ----------
    old, new : sequence of RulingRecord
        All rulings of each run, in order.
    """
    return tuple(
        RulingPair(old=old[first], new=new[second])
        for first, second in enumerate(_matched(old, new))
        if second is not None and old[first].verdict != new[second].verdict
    )


def one_sided(
    old: Sequence[RulingRecord], new: Sequence[RulingRecord]
) -> tuple[tuple[RulingRecord, ...], tuple[RulingRecord, ...]]:
    """Decisions that only the old run had to make, and those that only the new one had to."""
    pairs = _matched(old, new)
    taken = set(pairs)
    return (
        tuple(ruling for ruling, pair in zip(old, pairs, strict=True) if pair is None),
        tuple(ruling for place, ruling in enumerate(new) if place not in taken),
    )


def parting(old: Sequence[RulingRecord], new: Sequence[RulingRecord]) -> RulingPair | None:
    """The first decision at which the two runs go different ways; None where they never do.

    Two runs go the same way as long as the same step says the same of the same subject; by how much
    a limit was missed does not matter.
    """
    for first, second in zip(old, new, strict=False):
        if (first.step, first.subject, first.verdict) != (second.step, second.subject, second.verdict):
            return RulingPair(old=first, new=second)
    shared = min(len(old), len(new))
    if len(old) == len(new):
        return None
    return RulingPair(old=(*old, None)[shared], new=(*new, None)[shared])


def _matched(old: Sequence[RulingRecord], new: Sequence[RulingRecord]) -> list[int | None]:
    """For each old ruling the position of the new one on the same thing, or None."""
    pairs: list[int | None] = [None] * len(old)
    free = list(range(len(new)))
    # Another clause may decide on the same subject: a keep rule where selection did.
    for name in (_by_clause, _by_subject):
        left = [place for place, pair in enumerate(pairs) if pair is None]
        waiting = dict(zip(_numbered([new[place] for place in free], name), free, strict=True))
        for place, key in zip(left, _numbered([old[place] for place in left], name), strict=True):
            pairs[place] = waiting.pop(key, None)
        free = sorted(waiting.values())
    return pairs


def _by_clause(ruling: RulingRecord) -> Hashable:
    return ruling.step, ruling.clause, ruling.subject


def _by_subject(ruling: RulingRecord) -> Hashable:
    return ruling.step, ruling.subject


def _numbered(
    rulings: Sequence[RulingRecord], name: Callable[[RulingRecord], Hashable]
) -> list[tuple[Hashable, int]]:
    """Names of rulings, those that share one numbered in their order."""
    seen: Counter[Hashable] = Counter()
    found = []
    for ruling in rulings:
        key = name(ruling)
        found.append((key, seen[key]))
        seen[key] += 1
    return found
