from __future__ import annotations

import statistics
import subprocess
import sys
import time
from collections.abc import Callable
from typing import Any

import pytest
import typer
from typer.main import get_command

from beforehand.cli.app import app
from beforehand.version import __version__

COMMANDS = [
    "draft",
    "check",
    "rehearse",
    "seal",
    "run",
    "replay",
    "trace",
    "report",
    "predict",
    "compare",
    "refresh",
    "handover",
    "receive",
    "schema",
    "guide",
]
Command = Callable[..., subprocess.CompletedProcess[str]]


def test_the_help_of_the_program_is_this_text(command: Command) -> None:
    """Plain text at 80 columns: what it is, its options, its commands, its exit codes."""
    done = command("--help", env={"COLUMNS": "80"})
    assert (done.returncode, done.stderr) == (0, "")
    assert done.stdout == (
        "Usage: beforehand [OPTIONS] COMMAND [ARGS]...\n"
        "\n"
        "  Write every decision of a multiple regression as a rule, then run it.\n"
        "\n"
        "  A plan holds the decisions, written before the results are seen. A run\n"
        "  follows it and leaves a lockfile: every fit and every ruling, on the record,\n"
        "  to be traced and replayed.\n"
        "\n"
        "Options:\n"
        "  --version          Print the version and leave.\n"
        "  --report-bug FILE  Where the program itself fails, write the traceback to\n"
        "                     FILE. BEFOREHAND_TRACEBACK=1 in the environment shows it\n"
        "                     at once.\n"
        "  -h, --help         Show this message and exit.\n"
        "\n"
        "Commands:\n"
        "  draft     Draft a plan for a table.\n"
        "  check     Check a plan, and its table against it.\n"
        "  rehearse  Try a plan on worlds whose truth is known, and say how it does.\n"
        "  seal      Seal a plan: fix it, and be able to show that it came first.\n"
        "  run       Run a plan, write the lockfile, print the answer.\n"
        "  replay    Compute a record again and say what differs.\n"
        "  trace     Tell the story of one predictor or one row.\n"
        "  report    Write the report of a lockfile, the key finding first.\n"
        "  predict   Predict new cases by the answer in a lockfile.\n"
        "  compare   Say what changed between two plans or two lockfiles.\n"
        "  refresh   Run a plan on refreshed data and say whether the answer holds.\n"
        "  handover  Pack a plan and its record, to be checked by someone else.\n"
        "  receive   Check a bundle, unpack it, and compute its lockfile again.\n"
        "  schema    Print the JSON Schema of plans, of lockfiles or of rehearsals.\n"
        "  guide     Explain the plan block by block, the rules, the record.\n"
        "\n"
        "  Exit codes: 0 done, 2 unusable input, 3 it comes out differently.\n"
    )


@pytest.mark.parametrize("name", COMMANDS)
def test_the_help_of_each_command_fits_80_columns(name: str, command: Command) -> None:
    """No line is longer, none is cut off, the first says how to call it."""
    done = command(name, "--help", env={"COLUMNS": "80"})
    assert (done.returncode, done.stderr) == (0, "")
    lines = done.stdout.split("\n")
    assert lines[0].startswith(f"Usage: beforehand {name} [OPTIONS]")
    assert max(map(len, lines)) <= 80
    assert "..." not in done.stdout
    assert not any(sign in done.stdout for sign in "│╭╰─{}")


def test_every_command_and_every_option_has_help() -> None:
    """A user never has to guess what an option does."""
    group: Any = get_command(app)
    assert list(group.commands) == COMMANDS
    silent = [
        f"{name} {parameter.name}"
        for name, one in group.commands.items()
        for parameter in one.params
        if not getattr(parameter, "help", None)
    ]
    assert silent == []
    assert all(one.help for one in group.commands.values())


def test_the_version_is_told(command: Command) -> None:
    """One line on standard output."""
    done = command("--version")
    assert (done.returncode, done.stdout, done.stderr) == (0, f"beforehand {__version__}\n", "")


@pytest.mark.parametrize(
    ("args", "said"),
    [
        ([], "Usage: beforehand [OPTIONS] COMMAND"),
        (["rnu"], "Did you mean 'run'?"),
        (["run"], "Missing argument 'PLAN'"),
        (["run", "--alpha", "0.01", "a.plan.yaml"], "No such option: --alpha"),
        (["draft", "a.csv"], "Missing option '--outcome'"),
        (["schema", "table"], "is not one of 'plan', 'lock', 'rehearsal'"),
    ],
)
def test_a_usage_error_goes_to_standard_error_and_ends_with_2(
    args: list[str], said: str, command: Command
) -> None:
    """What is wrong with the call, and nothing on standard output."""
    done = command(*args)
    assert (done.returncode, done.stdout) == (2, "")
    assert said in done.stderr
    assert "Traceback" not in done.stderr


def test_help_needs_nothing_heavy(environment: dict[str, str]) -> None:
    """Neither numpy nor rich, let alone what a run needs, is loaded for a page of help."""
    code = (
        "import sys\nfrom beforehand.cli.app import app\n"
        "try:\n    app(['run', '--help'])\nexcept SystemExit:\n    pass\n"
        "heavy = ['numpy', 'scipy', 'pandas', 'statsmodels', 'yaml', 'rich']\n"
        "print([name for name in heavy if name in sys.modules], file=sys.stderr)\n"
    )
    done = subprocess.run(
        [sys.executable, "-c", code], env=environment, capture_output=True, text=True, check=True
    )
    assert done.stderr == "[]\n"


def test_help_comes_at_once(environment: dict[str, str]) -> None:
    """As a whole process at most 2.5 times what importing typer and pydantic takes."""

    def seconds(*args: str) -> float:
        taken = []
        for _ in range(5):
            start = time.perf_counter()
            subprocess.run([sys.executable, *args], env=environment, check=True, capture_output=True)
            taken.append(time.perf_counter() - start)
        return statistics.median(taken)

    assert seconds("-m", "beforehand.cli", "--help") <= 2.5 * seconds("-c", "import typer, pydantic")


def test_the_group_is_a_typer_app() -> None:
    """So that it can be mounted in another program."""
    assert isinstance(app, typer.Typer)
