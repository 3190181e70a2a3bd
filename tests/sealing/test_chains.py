"""Chains of seals and looks: what is appended holds, and what was touched is found at its place."""

from __future__ import annotations

import itertools
import json
import os
import subprocess
import sys
from pathlib import Path

import pytest

import beforehand
from beforehand import LockError, plan_from_mapping
from beforehand.sealing import (
    add_look,
    append_seal,
    looks_path,
    plans_that_met,
    read_looks,
    read_seals,
    seal_path,
)
from beforehand.sealing.chain import broken_link, digest_of

PLAN = {
    "language": 1,
    "title": "Kettles",
    "question": "Does scale slow a kettle?",
    "data": {"file": "kettles.csv"},
    "outcome": {"column": "minutes"},
    "predictors": [{"column": "scale", "range": [0, 3]}, {"column": "litres"}],
}


def plan(**changes):
    """A small plan."""
    return plan_from_mapping({**PLAN, **changes})


def sealed(path, number=1, **changes):
    """Append a seal that differs by its author."""
    return append_seal(
        path, plan(**changes), file="kettles.plan.yaml", by=f"person {number}", seen="nothing",
        sealed="2026-12-01T10:00:00Z", data=None, commit=None, amendment=None,
    )  # fmt: skip


def look(path, number, outcome="minutes", plan_digest=None):
    """Add a look."""
    return add_look(
        path, date="2026-12-01T10:00:00Z", outcome=outcome, plan=plan_digest or f"sha256:{number:064x}",
        data="sha256:d", lock="sha256:l", status="adopted", seal=None,
    )  # fmt: skip


def test_names_beside_a_plan():
    """NAME.seal.yaml and NAME.looks, whatever the plan's ending."""
    assert seal_path("a/kettles.plan.yaml") == Path("a/kettles.seal.yaml")
    assert looks_path("kettles.yml") == Path("kettles.looks")


def test_a_digest_is_of_content():
    """Order of keys, tuples for lists and 3.0 for 3 are the same; anything else is not."""
    assert digest_of({"a": 1, "b": [3.0, "x"]}) == digest_of({"b": (3, "x"), "a": 1})
    assert digest_of({"a": 1}) != digest_of({"a": "1"})
    assert digest_of({"a": None}) != digest_of({})


def test_seals_come_back_as_they_were_made(tmp_path):
    """Two seals, the second on the first, with the plan as it was at each."""
    path = tmp_path / "kettles.seal.yaml"
    first, second = sealed(path), sealed(path, 2, alpha=0.1)
    assert read_seals(path) == (first, second)
    assert [seal.number for seal in read_seals(path)] == [1, 2]
    assert read_seals(path)[1].plan() == plan(alpha=0.1)
    assert read_seals(tmp_path / "none.seal.yaml") == ()


@pytest.mark.parametrize(
    ("old", "new", "place"),
    [
        ("by: person 1", "by: person 9", "seal 1: it was changed"),
        ("by: person 2", "by: person 9", "seal 2: it was changed"),
        ("alpha: 0.05", "alpha: 0.5", "seal 1: it was changed"),
        ("seen: nothing", "seen: everything", "seal 1: it was changed"),
        ("  - seal: 1", "  - seal: 2", "seal 1 is not one"),
        ("seals:", "sealed:", "no file of seals"),
        ("seen: nothing", "seen: &a nothing", "no file of seals"),
        ("seals:", "seals: [", ""),
    ],
)
def test_a_touched_seal_is_found_at_its_place(tmp_path, old, new, place):
    """Any edit is refused with the place, and nothing can be appended to what is broken."""
    path = tmp_path / "kettles.seal.yaml"
    sealed(path)
    sealed(path, 2)
    text = path.read_text(encoding="utf-8")
    assert old in text
    path.write_text(text.replace(old, new, 1), encoding="utf-8")
    before = path.read_bytes()
    with pytest.raises(LockError) as caught:
        read_seals(path)
    assert place in str(caught.value)
    assert len(caught.value.faults) == 1
    with pytest.raises(LockError):
        sealed(path, 3)
    assert path.read_bytes() == before


@pytest.mark.parametrize(
    "by",
    ["Ä. Ütz: “no”", "a: b # c", "- x", "'\"\\", "yes", "1.0", "null", "雪", "~", "{}", "@x", " &a *b !c"],
)
def test_any_name_comes_back(tmp_path, by):
    """Whatever a YAML reader could take a name for, it is read as it was given."""
    path = tmp_path / "kettles.seal.yaml"
    for number in (1, 2):
        append_seal(
            path, plan(), file="kettles.plan.yaml", by=by, seen="nothing", sealed="2026-12-01T10:00:00Z",
            data=None, commit=None, amendment=None,
        )  # fmt: skip
        assert read_seals(path)[-1].by == by, number


def test_what_cannot_be_read_again_is_not_written(tmp_path):
    """A name with a control sign in it leaves the chain as it is."""
    path = tmp_path / "kettles.seal.yaml"
    sealed(path)
    before = path.read_bytes()
    with pytest.raises(LockError):
        append_seal(
            path, plan(), file="kettles.plan.yaml", by="a\x00b", seen="nothing", sealed="now",
            data=None, commit=None, amendment=None,
        )  # fmt: skip
    assert path.read_bytes() == before


def test_a_seal_taken_out_breaks_the_chain(tmp_path):
    """Without its first or middle item the rest does not follow on; the last alone can be cut unseen."""
    records = [{"seal": 1, "previous": None}, {"seal": 2}, {"seal": 3}]
    for place, record in enumerate(records):
        if place:
            record["previous"] = records[place - 1]["digest"]
        record["digest"] = digest_of(record)
    assert broken_link(records) is None
    assert broken_link(records[1:])[0] == 0
    assert broken_link([records[0], records[2]])[0] == 1
    assert broken_link([records[0], records[0]])[0] == 1


def test_looks_are_lines_of_json(tmp_path):
    """One line a look, linked; the count is of different plans on the same outcome."""
    path = tmp_path / "kettles.looks"
    for number in (1, 2, 2, 3):
        looks = look(path, number)
    looks = look(path, 4, outcome="litres")
    assert looks == read_looks(path)
    lines = [json.loads(line) for line in path.read_text(encoding="utf-8").splitlines()]
    assert [line["look"] for line in lines] == [1, 2, 3, 4, 5]
    assert all(later["previous"] == one["digest"] for one, later in itertools.pairwise(lines))
    assert plans_that_met(looks, "minutes") == 3
    assert plans_that_met(looks, "litres") == 1


@pytest.mark.parametrize("gone", [0, 1, 2])
def test_a_look_that_was_deleted_shows(tmp_path, gone):
    """Any line but the last taken out is found, and so is a line that was written anew."""
    path = tmp_path / "kettles.looks"
    for number in range(4):
        look(path, number)
    lines = path.read_text(encoding="utf-8").splitlines()
    path.write_text("\n".join(line for at, line in enumerate(lines) if at != gone) + "\n", encoding="utf-8")
    with pytest.raises(LockError, match="register of looks is broken"):
        read_looks(path)
    renumbered = [json.loads(line) for at, line in enumerate(lines) if at != gone]
    for number, record in enumerate(renumbered, 1):
        record["look"] = number
    path.write_text("".join(json.dumps(record) + "\n" for record in renumbered), encoding="utf-8")
    with pytest.raises(LockError, match=r"broken at look \d"):
        look(path, 9)


@pytest.mark.parametrize("content", [b"\xff\xfe", b"[1]\n", b"nothing\n", b'{"look": 1}\n'])
def test_what_is_no_register(tmp_path, content):
    """Anything else under that name is refused in one line and left as it is."""
    path = tmp_path / "kettles.looks"
    path.write_bytes(content)
    with pytest.raises(LockError) as caught:
        look(path, 1)
    assert len(caught.value.faults) == 1
    assert path.read_bytes() == content


MANY = """
import sys
from pathlib import Path
from beforehand.sealing import add_look
for number in range(15):
    add_look(
        Path(sys.argv[1]), date="2026-12-01T10:00:00Z", outcome="minutes", plan=f"{sys.argv[2]} {number}",
        data="d", lock="l", status="adopted", seal=None,
    )
"""


def test_two_runs_at_once_lose_nothing(tmp_path):
    """Four processes add fifteen looks each; sixty stand in one whole chain, and no file beside it."""
    path = tmp_path / "kettles.looks"
    environment = {**os.environ, "PYTHONPATH": str(Path(beforehand.__file__).parents[1])}
    workers = [
        subprocess.Popen([sys.executable, "-c", MANY, str(path), str(number)], env=environment)
        for number in range(4)
    ]
    assert [worker.wait(120) for worker in workers] == [0] * 4
    assert len(read_looks(path)) == 60
    assert [found.name for found in tmp_path.iterdir()] == ["kettles.looks"]
