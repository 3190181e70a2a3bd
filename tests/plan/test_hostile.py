"""Whatever is handed in, reading gives a plan or says in whole lines what is wrong."""

from __future__ import annotations

import random
import time
from typing import Any

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from beforehand.faults import PlanError
from beforehand.plan import (
    Plan,
    canonical_text,
    decisions_digest,
    plan_from_mapping,
    plan_from_text,
    whole_digest,
    written_out,
)

from .conftest import LARGE, SMALL  # type: ignore[import-not-found]  # tests are no package

PIECES = [
    *" :{}[]-,#&*!|>'\"%@`\t\n\\.~?=",
    "null", "no", "0x1", "1e999", "é", "\u2028", "\x85", "\x00", "\ud800", "<<", "---\n", "\n\n", "  ", "- ",
    "&a ", "*a", "!!int ", "100%", "4/n", "''", '""', "[[", "}}", "\r\n", "\ufeff", "language: 2\n",
]  # fmt: skip


def outcome_of(make: Any, data: Any) -> Plan | None:
    """Make the plan; None where it was refused in whole, single lines."""
    try:
        plan: Plan = make(data)
    except PlanError as error:
        refused = error
    else:
        return plan
    for fault in refused.faults:
        assert fault.what
        assert fault.code
        assert "\n" not in str(fault)
        assert "\x1f" not in str(fault)
    return None


def is_sound(plan: Plan) -> None:
    """A plan that was read can be written, read back, and told by its digests."""
    again = plan_from_text(canonical_text(plan))
    assert again == plan
    assert plan_from_mapping(written_out(plan)) == plan
    assert whole_digest(again) == whole_digest(plan)
    assert decisions_digest(again) == decisions_digest(plan)


def damaged(rng: random.Random) -> str:
    """The large plan with a few pieces put in, cut out or moved."""
    text: str = LARGE
    for _ in range(rng.choice([1, 1, 1, 2, 4])):
        at = rng.randrange(len(text))
        end = min(len(text), at + rng.randrange(1, 30))
        start = rng.randrange(len(text))
        way = rng.choice(["put in", "cut", "replace", "move"])
        piece = text[start : start + end - at] if way == "move" else rng.choice(PIECES)
        text = text[:at] + ("" if way == "cut" else piece) + text[at if way == "put in" else end :]
    return text


@given(st.randoms(use_true_random=False))
@settings(max_examples=300, deadline=None, suppress_health_check=[HealthCheck.too_slow])
def test_damaged_plans(rng: random.Random) -> None:
    """A plan with characters lost, moved or put in is read soundly or refused."""
    plan = outcome_of(plan_from_text, damaged(rng))
    if plan is not None:
        is_sound(plan)


@given(st.text(alphabet=st.one_of(st.characters(), st.sampled_from(":-[]{}#&*!|>'\"%\n\t ab1")), max_size=60))
@settings(max_examples=300, deadline=None)
def test_any_text(text: str) -> None:
    """Any text at all is refused in whole lines."""
    outcome_of(plan_from_text, text)


KEYS = sorted(
    {key for block in (SMALL, written_out(plan_from_text(LARGE))) for key in block}
    | {"column", "file", "fill", "at_most", "rule", "predictor", "levels", "kind", "range", "weights", "from"}
)
ODD = st.one_of(
    st.none(), st.booleans(), st.integers(), st.floats(), st.text(max_size=8), st.binary(max_size=3),
    st.sampled_from(["always", "skip", "category", "40%", "4/n", "honey", "bloom", "log", "classical"]),
)  # fmt: skip
NESTED = st.recursive(
    ODD,
    lambda inner: st.one_of(
        st.lists(inner, max_size=3), st.dictionaries(st.one_of(st.sampled_from(KEYS), ODD), inner, max_size=3)
    ),
    max_leaves=8,
)


@given(st.dictionaries(st.sampled_from(KEYS), NESTED, max_size=4))
@settings(max_examples=300, deadline=None, suppress_health_check=[HealthCheck.too_slow])
def test_any_blocks(blocks: dict[str, Any]) -> None:
    """The small plan with anything in any block is read soundly or refused."""
    plan = outcome_of(plan_from_mapping, {**SMALL, **blocks})
    if plan is not None:
        is_sound(plan)


def places(value: Any, path: tuple[Any, ...] = ()) -> list[tuple[Any, ...]]:
    """The path of every value inside plain data."""
    found = [path] if path else []
    items = value.items() if isinstance(value, dict) else enumerate(value) if isinstance(value, list) else ()
    for key, item in items:
        found += places(item, (*path, key))
    return found


WRITTEN = written_out(plan_from_text(LARGE))
PLACES = places(WRITTEN)


def replaced(value: Any, path: tuple[Any, ...], new: Any) -> Any:
    """Plain data with the value at a path replaced."""
    if not path:
        return new
    if isinstance(value, dict):
        return {key: replaced(item, path[1:], new) if key == path[0] else item for key, item in value.items()}
    return [replaced(item, path[1:], new) if key == path[0] else item for key, item in enumerate(value)]


@given(st.lists(st.tuples(st.sampled_from(PLACES), NESTED), min_size=1, max_size=3))
@settings(max_examples=400, deadline=None, suppress_health_check=[HealthCheck.too_slow])
def test_anything_anywhere(swaps: list[tuple[tuple[Any, ...], Any]]) -> None:
    """The large plan with anything in the place of any of its values is read soundly or refused."""
    data = WRITTEN
    for path, new in swaps:
        try:
            data = replaced(data, path, new)
        except TypeError:
            continue
    plan = outcome_of(plan_from_mapping, data)
    if plan is not None:
        is_sound(plan)


@pytest.mark.parametrize(
    "text",
    [
        "a: " * 10_000,
        "- " * 10_000,
        "? " * 10_000,
        "{" * 10_000,
        "'" * 10_000,
        "a: &a [*a]",
        "a: |" + "\n " * 10_000,
        "a" * 100_000 + ": 1",
        "language: " + "9" * 100_000,
        LARGE.replace("alpha: 5%", "alpha: " + "9" * 10_000 + "%"),
        LARGE.replace("[rain, warm]", "[" + "rain, " * 50_000 + "warm]"),
        LARGE.replace("products:\n", "products:\n" + "  - [bloom, sun]\n" * 5_000),
        LARGE.replace(
            "products:\n",
            "".join(f"  - {{column: x{n}, rol: focal}}\n" for n in range(5_000)) + "products:\n",
        ),
        LARGE.replace("(day_temp - night_temp) / 2", "(" * 400 + "a" + ")" * 400),
        LARGE.replace(
            "slopes: {bloom: 0.2}", "slopes: {" + ", ".join(f"b{n}: 1" for n in range(5_000)) + "}"
        ),
        LARGE.replace("keep:\n", "keep:\n" + "  - {at_least_one_of: [rain, warm], because: b}\n" * 3_000),
        LARGE.replace(
            "alternatives:\n",
            "alternatives:\n" + "".join(f"  a{n}: {{alpha: 0.1{n:03}}}\n" for n in range(98)),
        ),
        LARGE.replace("levels: [dark,", "levels: [" + "".join(f"l{n}, " for n in range(20_000)) + "dark,"),
        "\n".join(f"k{n}: 1" for n in range(20_000)),
    ],
    ids=str.__len__,
)
def test_large_and_deep(text: str) -> None:
    """A text that is large, deep or full of faults costs seconds at most."""
    # Its own time, not the clock's: a busy machine is no fault of the reader.
    start = time.process_time()
    outcome_of(plan_from_text, text)
    assert time.process_time() - start < 10.0
