"""What differs between two locks."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import pytest

from beforehand.lock import Checks, Difference, Lock, Replay, differences, replay_of, sealed_lock
from beforehand.lock.record import Record


def swapped(record: Any, **fields: Any) -> Any:
    """Give a record with other fields."""
    return type(record)(**{**{name: getattr(record, name) for name in type(record).model_fields}, **fields})


def with_answer(lock: Lock, **fields: Any) -> Lock:
    """Give the lock with another answer."""
    return swapped(lock, answer=swapped(lock.answer, **fields))


def with_coefficient(lock: Lock, value: float) -> Lock:
    """Give the lock with another coefficient in its answer."""
    assert lock.answer is not None
    return with_answer(lock, terms=(swapped(lock.answer.terms[0], coefficient=value),))


def test_a_lock_does_not_differ_from_itself(lock: Lock) -> None:
    """Neither from itself nor from what is read back of it."""
    assert differences(lock, lock) == ()
    assert differences(lock, sealed_lock(lock)) == ()


def test_what_a_run_was_made_with_is_no_difference(lock: Lock) -> None:
    """Environment and digest stand outside."""
    other = swapped(lock, environment=swapped(lock.environment, python="3.13.0"), digest="sha256:" + "0" * 64)
    assert replay_of(lock, other) == Replay(same_bytes=True, differences=())


def test_a_number_is_held_against_the_tolerance(lock: Lock) -> None:
    """A hundred-millionth of the larger one is the same, more is a difference."""
    near, far = with_coefficient(lock, 6.41 * (1 + 9e-9)), with_coefficient(lock, 6.41 * (1 + 2e-8))
    assert replay_of(lock, near) == Replay(same_bytes=False, differences=())
    (found,) = differences(lock, far)
    assert found == Difference(
        place="answer.terms[outdoor_temp].coefficient", kind="number", old=6.41, new=6.410000128
    )
    assert str(found) == "answer.terms[outdoor_temp].coefficient: 6.41 before, 6.410000128 now"
    assert differences(lock, far, relative=1e-7) == ()
    assert differences(lock, near, relative=0.0) != ()


def test_the_same_digits_are_the_same_bytes(lock: Lock) -> None:
    """What differs beyond the recorded digits differs nowhere."""
    assert replay_of(lock, with_coefficient(lock, 6.41 * (1 + 1e-13))).same_bytes


def test_counts_are_the_same_or_not(lock: Lock) -> None:
    """One row more is a difference, however many rows there are."""
    old = swapped(lock, data=swapped(lock.data, rows=10**12))
    new = swapped(lock, data=swapped(lock.data, rows=10**12 + 1))
    assert differences(old, new) == (
        Difference(place="data.rows", kind="number", old=10**12, new=10**12 + 1),
    )


@pytest.mark.parametrize(
    ("change", "said"),
    [
        (lambda lock: swapped(lock, status="mean_only"), ["status: adopted before, mean_only now"]),
        (lambda lock: with_answer(lock, f=None), ["answer.f: 100.5 before, null now"]),
        (lambda lock: with_answer(lock, f_df=(1, 395)), ["answer.f_df[1]: 394 before, 395 now"]),
        (
            lambda lock: with_answer(lock, cautions=(*lock.answer.cautions, "Few rows.")),
            ["answer.cautions[1]: Few rows. is new"],
        ),
        (
            lambda lock: swapped(lock, rulings=lock.rulings[1:]),
            ['rulings[R001]: "pallets: full_enough." is missing'],
        ),
        (
            lambda lock: swapped(lock, fits=lock.fits[:2] + lock.fits[3:]),
            ["fits[F003]: working model is missing"],
        ),
        (
            lambda lock: swapped(lock, rows_removed=()),
            ['rows_removed[r0147]: "{row: r0147, step: influence, ruling: R004}" is missing'],
        ),
        (
            lambda lock: swapped(lock, fits=lock.fits[::-1]),
            ['fits: "F001, F002, F003, F004" before, "F004, F003, F002, F001" now'],
        ),
        (
            lambda lock: swapped(
                lock, rulings=(swapped(lock.rulings[0], evidence={"share": 0.5}), *lock.rulings[1:])
            ),
            ["rulings[R001].evidence[share]: 0.5 is new"],
        ),
        (
            lambda lock: swapped(lock, plan=swapped(lock.plan, written={**lock.plan.written, "alpha": 0.01})),
            ["plan.written[alpha]: 0.05 before, 0.01 now"],
        ),
        (
            lambda lock: swapped(
                lock,
                checks=swapped(
                    lock.checks, jointly_without_flagged=None, influence=lock.checks.influence[:1]
                ),
            ),
            [
                "checks.influence[r0200]: "
                '"{row: r0200, ruling: R005, leverage: 0.02, studentized_residual: -2.5, '
                "cooks_distance: 0.5, dffits: null, change_r_squared: 0.01, change_coefficient: 1.25, "
                'of: load, significance_changes: [], sign_changes: [], stays: true}" is missing',
                "checks.jointly_without_flagged: "
                '"{rows: 1, fit: F003, change_r_squared: 0.001, change_coefficient: 0.25, of: load}" '
                "before, null now",
            ],
        ),
        (
            lambda lock: swapped(
                lock, alternatives={"stricter": swapped(lock.alternatives["stricter"], holds=True)}
            ),
            ["alternatives[stricter].holds: false before, true now"],
        ),
    ],
)
def test_each_difference_is_told_with_its_place(
    lock: Lock, change: Callable[[Lock], Lock], said: list[str]
) -> None:
    """Values, missing and new items, and another order each have their words."""
    assert [str(found) for found in differences(lock, change(lock))] == said


def test_items_are_matched_by_name_not_by_position(lock: Lock) -> None:
    """One term more at the head of a fit is one difference."""
    fit = lock.fits[3]
    term = swapped(fit.terms[1], term="load", predictor="load")
    other = swapped(lock, fits=(*lock.fits[:3], swapped(fit, terms=(term, *fit.terms))))
    assert [(found.place, found.kind) for found in differences(lock, other)] == [
        ("fits[F004].terms[load]", "added")
    ]


def test_items_that_share_a_name_are_matched_by_position(lock: Lock) -> None:
    """Where a name is not one item's own, the position stands for it."""
    twice = swapped(lock, ledger=lock.ledger * 2)
    other = swapped(twice, ledger=(twice.ledger[0], swapped(twice.ledger[1], rows=400)))
    assert [str(found) for found in differences(twice, other)] == ["ledger[1].rows: 412 before, 400 now"]


def test_every_difference_of_one_field_is_found(lock: Lock) -> None:
    """Whatever scalar of the record changes, its change is told, once."""

    def leaves(value: Any, path: tuple[Any, ...]) -> list[tuple[Any, ...]]:
        if isinstance(value, Record):
            return [
                leaf
                for name in type(value).model_fields
                for leaf in leaves(getattr(value, name), (*path, name))
            ]
        if isinstance(value, tuple):
            return [leaf for place, item in enumerate(value) for leaf in leaves(item, (*path, place))]
        return [path] if isinstance(value, float) else []

    def moved(value: Any, path: tuple[Any, ...]) -> Any:
        if not path:
            return value * 2.0 + 1.0
        head, rest = path[0], path[1:]
        if isinstance(value, tuple):
            return tuple(moved(item, rest) if place == head else item for place, item in enumerate(value))
        return swapped(value, **{head: moved(getattr(value, head), rest)})

    paths = leaves(lock, ())
    assert len(paths) > 50
    for path in paths:
        (found,) = differences(lock, moved(lock, path))
        assert found.kind == "number"
        assert found.place.endswith(str(path[-1]))


def test_locks_of_other_sections_are_compared_whole(lock: Lock) -> None:
    """A table of checks that is new in full is told item by item."""
    empty = swapped(
        lock, checks=Checks(**{**dict.fromkeys(Checks.model_fields, ()), "jointly_without_flagged": None})
    )
    assert [found.place for found in differences(empty, lock)] == [
        "checks.correlations[collinearity, load, pallets]",
        "checks.assumptions[C001]",
        "checks.influence[r0147]",
        "checks.influence[r0200]",
        "checks.jointly_without_flagged",
    ]
