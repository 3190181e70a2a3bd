from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path
from types import SimpleNamespace
from typing import Any

import pytest

from beforehand.cli.names import lock_beside, plan_beside
from beforehand.lock import Lock
from beforehand.lock.difference import Difference, Replay
from beforehand.lock.trace import trace
from beforehand.screen.answer import answer_text
from beforehand.screen.story import story_text

Invoke = Callable[..., Any]


@pytest.fixture
def running(api: SimpleNamespace, lock: Lock) -> SimpleNamespace:
    """An api whose run gives the lock of the hives, and notes what it was asked for."""
    api.asked = []

    def run(plan: Path, data: Path | None, *, progress: Callable[[str], None]) -> SimpleNamespace:
        api.asked.append((plan, data))
        progress("selection")
        return SimpleNamespace(lock=lock, status=lock.status, looks=())

    def write_lock(_: Lock, path: Path) -> None:
        path.write_text("# Written by beforehand.\nlock: 1\n", encoding="utf-8")

    api.run, api.write_lock = run, write_lock
    return api


def test_run_writes_the_record_beside_the_plan_and_prints_the_answer(
    running: SimpleNamespace, invoke: Invoke, lock: Lock, tmp_path: Path
) -> None:
    """The answer on standard output, nothing on standard error."""
    plan = tmp_path / "hives.plan.yaml"
    done = invoke("run", plan)
    record = tmp_path / "hives.lock.yaml"
    assert (done.exit_code, done.stderr) == (0, "")
    assert done.stdout == answer_text(lock, str(record), width=100)
    assert record.exists()
    assert running.asked == [(plan, None)]


def test_run_takes_another_table_and_another_name(
    running: SimpleNamespace, invoke: Invoke, tmp_path: Path
) -> None:
    """``--data`` and ``-o`` go where they should."""
    record = tmp_path / "q2.lock.yaml"
    assert invoke("run", "hives.plan.yaml", "--data", "q2.csv", "-o", record).exit_code == 0
    assert running.asked == [(Path("hives.plan.yaml"), Path("q2.csv"))]
    assert record.exists()


def test_a_quiet_run_prints_nothing(running: SimpleNamespace, invoke: Invoke, tmp_path: Path) -> None:
    """Only the record is left."""
    done = invoke("run", tmp_path / "hives.plan.yaml", "--quiet")
    assert (done.exit_code, done.output) == (0, "")
    assert (tmp_path / "hives.lock.yaml").exists()


def test_run_never_replaces_what_is_not_a_record(
    running: SimpleNamespace, invoke: Invoke, tmp_path: Path
) -> None:
    """A plan named as the output stays as it is, and nothing is run."""
    plan = tmp_path / "hives.plan.yaml"
    plan.write_text("language: 1\n", encoding="utf-8")
    done = invoke("run", plan, "-o", plan)
    assert (done.exit_code, done.stderr) == (
        2,
        f"{plan}: is not a lockfile and is left as it is; name another file\n",
    )
    assert plan.read_text(encoding="utf-8") == "language: 1\n"
    assert running.asked == []


def test_run_needs_a_file_for_the_record(running: SimpleNamespace, invoke: Invoke, tmp_path: Path) -> None:
    """Neither standard output nor a folder that is not there; nothing is run."""
    done = invoke("run", tmp_path / "hives.plan.yaml", "-o", "-")
    assert done.exit_code == 2
    assert "the record needs a file; standard output gets the answer" in done.stderr
    missing = tmp_path / "nowhere" / "hives.lock.yaml"
    done = invoke("run", tmp_path / "hives.plan.yaml", "-o", missing)
    assert (done.exit_code, done.stderr) == (
        2,
        f"{missing}: cannot be written: its folder does not exist\n",
    )
    assert running.asked == []


def test_run_replaces_an_older_record(running: SimpleNamespace, invoke: Invoke, tmp_path: Path) -> None:
    """A lock is the program's own and may be written again."""
    plan = tmp_path / "hives.plan.yaml"
    assert [invoke("run", plan).exit_code for _ in range(2)] == [0, 0]


def test_run_as_json_has_stable_keys_and_no_nan(
    running: SimpleNamespace, invoke: Invoke, tmp_path: Path
) -> None:
    """The keys are a promise to programs."""
    done = invoke("run", tmp_path / "hives.plan.yaml", "--json")
    result = json.loads(done.stdout, parse_constant=lambda word: pytest.fail(word))
    assert list(result) == [
        "status", "record", "digest", "plan", "seal", "looks", "rehearsed", "data", "answer", "sealed_answer",
        "ledger",
        "rows_removed", "predictors", "alternatives", "rulings", "fits",
    ]  # fmt: skip
    assert result["status"] == "adopted"
    assert result["answer"]["terms"][1]["coefficient"] == 0.2874410936
    assert result["alternatives"]["stricter"]["holds"] is False
    assert (result["rulings"], result["fits"]) == (14, 10)


def test_progress_is_told_on_standard_error_where_asked_for(
    running: SimpleNamespace, invoke: Invoke, tmp_path: Path
) -> None:
    """Plain lines with seconds, also without a terminal."""
    done = invoke("run", tmp_path / "hives.plan.yaml", "--progress", "--quiet")
    assert done.stdout == ""
    assert [line.split(" s  ")[1] for line in done.stderr.rstrip("\n").split("\n")] == [
        "running hives.plan.yaml",
        "selection",
        "writing the record",
    ]


@pytest.mark.parametrize(
    ("same_bytes", "differences", "code", "first"),
    [
        (True, (), 0, "Same: hives.lock.yaml"),
        (False, (), 0, "Same: hives.lock.yaml"),
        (
            False,
            (Difference(place="answer.rows", kind="number", old=207, new=208),),
            3,
            "Different: hives.lock.yaml, 1 difference",
        ),
    ],
)
def test_replay_ends_with_3_when_something_differs(
    same_bytes: bool,
    differences: tuple[Difference, ...],
    code: int,
    first: str,
    api: SimpleNamespace,
    invoke: Invoke,
) -> None:
    """0 the same, 3 different; the text says which."""
    api.replay = lambda *_, **__: Replay(same_bytes=same_bytes, differences=differences)
    done = invoke("replay", "hives.lock.yaml")
    assert (done.exit_code, done.stderr) == (code, "")
    assert done.stdout.split("\n")[0] == first


def test_replay_as_json_lists_every_difference(api: SimpleNamespace, invoke: Invoke) -> None:
    """Place, kind, old and new of each, and the exit code still says it."""
    found = Difference(place="answer.rows", kind="number", old=207, new=208)
    api.replay = lambda *_, **__: Replay(same_bytes=False, differences=(found,))
    done = invoke("replay", "hives.lock.yaml", "--json")
    assert done.exit_code == 3
    assert json.loads(done.stdout) == {
        "same": False,
        "same_bytes": False,
        "differences": [{"place": "answer.rows", "kind": "number", "old": 207, "new": 208}],
    }


def test_replay_passes_its_files_on(api: SimpleNamespace, invoke: Invoke) -> None:
    """Another plan and another table are used as named."""
    asked: list[object] = []

    def replay(*files: object, progress: object) -> Replay:
        asked.extend(files)
        return Replay(same_bytes=True, differences=())

    api.replay = replay
    invoke("replay", "a.lock.yaml", "--plan", "b.plan.yaml", "--data", "c.csv")
    assert asked == [Path("a.lock.yaml"), Path("b.plan.yaml"), Path("c.csv")]


def test_trace_tells_the_story(api: SimpleNamespace, invoke: Invoke, lock: Lock) -> None:
    """As text, and as JSON with the same rulings."""
    api.read_lock, api.trace = lambda _: lock, trace
    assert invoke("trace", "hives.lock.yaml", "rain").stdout == story_text(trace(lock, "rain"), width=100)
    told = json.loads(invoke("trace", "hives.lock.yaml", "rain", "--json").stdout)
    assert (told["subject"], told["verdict"], told["ruling"]) == ("rain", "removed", "R011")
    assert [entry["ruling"] for entry in told["entries"]] == ["R007", "R011"]


def test_an_unknown_subject_is_one_line(api: SimpleNamespace, invoke: Invoke, lock: Lock) -> None:
    """With the nearest name, exit 2."""
    api.read_lock, api.trace = lambda _: lock, trace
    done = invoke("trace", "hives.lock.yaml", "humidty")
    assert (done.exit_code, done.stdout) == (2, "")
    assert done.stderr.count("\n") == 1
    assert "(nearest: 'humidity')" in done.stderr


@pytest.fixture
def drafting(api: SimpleNamespace) -> SimpleNamespace:
    """An api whose draft is a short text with a sign of its own."""
    api.asked = []

    def draft(table: Path, outcome: str, *, separator: str | None) -> str:
        api.asked.append((table, outcome, separator))
        return "language: 1  # °C\n"

    api.draft = draft
    return api


def test_draft_writes_a_plan_beside_the_table(
    drafting: SimpleNamespace, invoke: Invoke, tmp_path: Path
) -> None:
    """The file is the result; the line that it is there goes to standard error."""
    plan = tmp_path / "hives.plan.yaml"
    done = invoke("draft", tmp_path / "hives.csv", "--outcome", "honey")
    assert (done.exit_code, done.stdout) == (0, "")
    assert done.stderr == f"{plan} written; read it from the top, then: beforehand check {plan}\n"
    assert plan.read_bytes() == "language: 1  # °C\n".encode()


def test_draft_to_standard_output_writes_no_file(
    drafting: SimpleNamespace, invoke: Invoke, tmp_path: Path
) -> None:
    """``-o -`` prints the plan and nothing else."""
    done = invoke("draft", tmp_path / "hives.csv", "--outcome", "honey", "-o", "-", "--separator", ";")
    assert (done.exit_code, done.stdout, done.stderr) == (0, "language: 1  # °C\n", "")
    assert list(tmp_path.iterdir()) == []
    assert drafting.asked == [(tmp_path / "hives.csv", "honey", ";")]


def test_draft_overwrites_a_plan_only_by_force(
    drafting: SimpleNamespace, invoke: Invoke, tmp_path: Path
) -> None:
    """A plan that a person may have worked on is not lost."""
    table, plan = tmp_path / "hives.csv", tmp_path / "hives.plan.yaml"
    plan.write_text("mine", encoding="utf-8")
    done = invoke("draft", table, "--outcome", "honey")
    assert (done.exit_code, done.stderr) == (
        2,
        f"{plan}: exists already and is left as it is; --force overwrites it\n",
    )
    assert plan.read_text(encoding="utf-8") == "mine"
    assert invoke("draft", table, "--outcome", "honey", "--force").exit_code == 0
    assert plan.read_text(encoding="utf-8") == "language: 1  # °C\n"


def test_draft_never_overwrites_the_table(drafting: SimpleNamespace, invoke: Invoke, tmp_path: Path) -> None:
    """Not even by force."""
    table = tmp_path / "hives.csv"
    table.write_text("honey\n1\n", encoding="utf-8")
    done = invoke("draft", table, "--outcome", "honey", "-o", table, "--force")
    assert (done.exit_code, done.stderr) == (
        2,
        f"{table}: is the table itself and is left as it is; name another file\n",
    )
    assert table.read_text(encoding="utf-8") == "honey\n1\n"


def test_schema_writes_a_file_and_replaces_only_a_schema(invoke: Invoke, tmp_path: Path) -> None:
    """Standard output or a file, the same text."""
    path = tmp_path / "lock.schema.json"
    assert invoke("schema", "lock", "-o", path).stderr == f"{path} written\n"
    assert path.read_text(encoding="utf-8") == invoke("schema", "lock").stdout
    assert invoke("schema", "lock", "-o", path).exit_code == 0
    path.write_text("mine", encoding="utf-8")
    assert invoke("schema", "lock", "-o", path).exit_code == 2
    assert path.read_text(encoding="utf-8") == "mine"


@pytest.mark.parametrize("what", ["plan", "lock", "rehearsal"])
def test_a_schema_is_json_of_its_kind(what: str, invoke: Invoke) -> None:
    """With the draft of JSON Schema that it is written in."""
    assert json.loads(invoke("schema", what).stdout)["$schema"].endswith("2020-12/schema")


@pytest.mark.parametrize(
    ("plan", "lock"),
    [
        ("a/hives.plan.yaml", "a/hives.lock.yaml"),
        ("hives.plan.yml", "hives.lock.yaml"),
        ("hives.yaml", "hives.lock.yaml"),
        ("hives", "hives.lock.yaml"),
        ("a.b.plan.yaml", "a.b.lock.yaml"),
    ],
)
def test_a_lock_is_named_after_its_plan(plan: str, lock: str) -> None:
    """The same name in the same folder."""
    assert lock_beside(Path(plan)) == Path(lock)


@pytest.mark.parametrize(
    ("table", "plan"),
    [
        ("a/hives.csv", "a/hives.plan.yaml"),
        ("hives.2026.csv", "hives.2026.plan.yaml"),
        (".csv", ".csv.plan.yaml"),
    ],
)
def test_a_plan_is_named_after_its_table(table: str, plan: str) -> None:
    """The same name in the same folder."""
    assert plan_beside(Path(table)) == Path(plan)
