from __future__ import annotations

import subprocess
import sys
from collections.abc import Callable
from pathlib import Path
from types import SimpleNamespace
from typing import Any

import pytest

from beforehand.faults import Fault, NumericalError, PlanError, WriteError

Invoke = Callable[..., Any]


def raising(error: BaseException) -> Callable[..., Any]:
    """A function that fails so."""

    def fail(*_: object, **__: object) -> Any:
        raise error

    return fail


def fault(line: int | None, place: str, what: str) -> Fault:
    """A fault of the plan."""
    return Fault(file="hives.plan.yaml", line=line, place=place, what=what, code="test")


def test_faults_are_told_one_a_line_and_nothing_else(api: SimpleNamespace, invoke: Invoke) -> None:
    """Exactly the faults on standard error, exit 2."""
    faults = [
        fault(12, "predictors[2].range", "ends before it begins"),
        fault(None, "", "is empty"),
    ]
    api.check = raising(PlanError(faults))
    done = invoke("check", "hives.plan.yaml")
    assert (done.exit_code, done.stdout) == (2, "")
    assert done.stderr == (
        "hives.plan.yaml:12: predictors[2].range: ends before it begins\nhives.plan.yaml: is empty\n"
    )


def test_a_fault_stays_on_one_line_whatever_it_quotes(api: SimpleNamespace, invoke: Invoke) -> None:
    """A quoted name with a line end or an escape sequence makes no second line and no colour."""
    api.check = raising(PlanError([fault(1, "title", "is 'a\nb\x1b[31m'")]))
    assert invoke("check", "hives.plan.yaml").stderr == "hives.plan.yaml:1: title: is 'a b?[31m'\n"


@pytest.mark.parametrize("error", [NumericalError("too few rows"), WriteError("x: no space is left")])
def test_other_errors_of_ours_are_one_line(error: Exception, api: SimpleNamespace, invoke: Invoke) -> None:
    """The message, exit 2."""
    api.check = raising(error)
    done = invoke("check", "hives.plan.yaml")
    assert (done.exit_code, done.stdout, done.stderr) == (2, "", f"{error}\n")


def test_an_interrupt_is_told_in_one_line(api: SimpleNamespace, invoke: Invoke) -> None:
    """Exit 130 and no traceback."""
    api.check = raising(KeyboardInterrupt())
    done = invoke("check", "hives.plan.yaml")
    assert (done.exit_code, done.stdout, done.stderr) == (130, "", "interrupted; nothing was written\n")


def test_too_little_memory_is_no_bug(api: SimpleNamespace, invoke: Invoke) -> None:
    """It is told as what it is, exit 2."""
    api.check = raising(MemoryError())
    done = invoke("check", "hives.plan.yaml")
    assert (done.exit_code, done.stderr) == (
        2,
        "out of memory: the table is too large for this machine; nothing was written\n",
    )


def test_a_bug_is_told_in_one_line(
    api: SimpleNamespace, invoke: Invoke, monkeypatch: pytest.MonkeyPatch
) -> None:
    """No traceback unless it is asked for, exit 1."""
    monkeypatch.delenv("BEFOREHAND_TRACEBACK", raising=False)
    api.check = raising(KeyError("first\nsecond"))
    done = invoke("check", "hives.plan.yaml")
    assert (done.exit_code, done.stdout) == (1, "")
    assert done.stderr == (
        "this is a bug in beforehand, not in your input: KeyError: 'first\\nsecond'; "
        "--report-bug FILE before the command writes a report of it\n"
    )


def test_the_environment_can_ask_for_the_traceback(
    api: SimpleNamespace, invoke: Invoke, monkeypatch: pytest.MonkeyPatch
) -> None:
    """BEFOREHAND_TRACEBACK=1 shows it at once, after the one line."""
    monkeypatch.setenv("BEFOREHAND_TRACEBACK", "1")
    api.check = raising(KeyError("load"))
    lines = invoke("check", "hives.plan.yaml").stderr.split("\n")
    assert lines[0].startswith("this is a bug in beforehand")
    assert lines[1] == "Traceback (most recent call last):"
    assert lines[-2] == "KeyError: 'load'"


def test_a_report_of_a_bug_goes_to_a_file(api: SimpleNamespace, invoke: Invoke, tmp_path: Path) -> None:
    """The file has versions, arguments and the traceback; the line says where it is."""
    api.check = raising(KeyError("load"))
    report = tmp_path / "bug.txt"
    done = invoke("--report-bug", report, "check", "hives.plan.yaml")
    assert done.exit_code == 1
    assert done.stderr == (
        f"this is a bug in beforehand, not in your input: KeyError: 'load'; the report is in {report}\n"
    )
    told = report.read_text(encoding="utf-8").split("\n")
    assert told[0].startswith("beforehand ")
    assert told[1].startswith("arguments: [")
    assert told[3] == "Traceback (most recent call last):"


def test_a_report_does_not_replace_a_file_of_a_person(
    api: SimpleNamespace, invoke: Invoke, tmp_path: Path
) -> None:
    """The wrong file name costs nobody a file."""
    api.check = raising(KeyError("load"))
    notes = tmp_path / "notes.txt"
    notes.write_text("mine", encoding="utf-8")
    assert (
        f"no report: {notes}: is not a report of a bug" in invoke("--report-bug", notes, "check", "x").stderr
    )
    assert notes.read_text(encoding="utf-8") == "mine"


def test_no_report_is_written_where_nothing_fails(invoke: Invoke, tmp_path: Path) -> None:
    """Bad input is no bug."""
    report = tmp_path / "bug.txt"
    assert invoke("--report-bug", report, "check").exit_code == 2
    assert not report.exists()


@pytest.mark.skipif(sys.platform == "win32", reason="pipes end otherwise there")
def test_a_reader_that_leaves_early_is_no_fault(environment: dict[str, str]) -> None:
    """``| head -1`` ends quietly, with the command's own exit code."""
    code = (
        "import os, sys\n"
        "from beforehand.cli import main\n"
        "os.close(1)\n"
        "read, write = os.pipe()\n"
        "os.close(read)\n"
        "assert write == 1 or os.dup2(write, 1) == 1\n"
        "sys.argv = ['beforehand', 'schema', 'lock']\n"
        "main()\n"
    )
    done = subprocess.run(
        [sys.executable, "-c", code], env=environment, capture_output=True, text=True, check=False
    )
    assert (done.returncode, done.stderr) == (0, "")


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="needs a device that is always full")
def test_a_full_disk_behind_standard_output_is_told(environment: dict[str, str]) -> None:
    """Not silently a success: one line, exit 2."""
    with Path("/dev/full").open("w") as full:
        done = subprocess.run(
            [sys.executable, "-m", "beforehand.cli", "schema", "lock"],
            env=environment,
            stdout=full,
            stderr=subprocess.PIPE,
            text=True,
            check=False,
        )
    assert (done.returncode, done.stderr) == (
        2,
        "standard output: cannot be written: No space left on device\n",
    )
