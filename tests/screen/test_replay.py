from __future__ import annotations

from beforehand.lock.difference import Difference, Replay
from beforehand.screen.replay import replay_text


def test_the_same_bytes_are_said_in_one_sentence() -> None:
    """Nothing differs: two lines."""
    assert replay_text(Replay(same_bytes=True, differences=()), "a.lock.yaml") == (
        "Same: a.lock.yaml\n  Every byte of the record comes out again.\n"
    )


def test_digits_beyond_the_tolerance_are_the_same_and_said_to_differ() -> None:
    """Other bytes without a difference that counts are told as what they are."""
    assert replay_text(Replay(same_bytes=False, differences=()), "a.lock.yaml") == (
        "Same: a.lock.yaml\n"
        "  Every number and ruling comes out again; only digits beyond the tolerance of 1e-8 differ.\n"
    )


def test_each_difference_stands_with_its_place() -> None:
    """One line a difference, in the words of the difference itself."""
    differences = (
        Difference(place="answer.terms[load].coefficient", kind="number", old=1.25, new=1.5),
        Difference(place="rulings[R012]", kind="missing", old="verdict: leaves", new=None),
    )
    text = replay_text(Replay(same_bytes=False, differences=differences), "a.lock.yaml")
    assert text == (f"Different: a.lock.yaml, 2 differences\n  {differences[0]}\n  {differences[1]}\n")
    assert "answer.terms[load].coefficient: 1.25 before, 1.5 now" in text


def test_a_thousand_differences_do_not_flood_the_screen() -> None:
    """The first two hundred, then where all of them are."""
    many = tuple(Difference(place=f"fits[F{n:03d}]", kind="number", old=1.0, new=2.0) for n in range(1000))
    lines = replay_text(Replay(same_bytes=False, differences=many), "my.lock.yaml").split("\n")
    assert len(lines) == 203
    assert lines[-2] == "  800 more: beforehand replay my.lock.yaml --json"
