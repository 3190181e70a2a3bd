from __future__ import annotations

import json
import shlex
import sys
from pathlib import Path

import pytest
import yaml

ROOT = Path(__file__).parents[2]
QUARTERS = (
    ROOT / "plans" / "repair-bench" / "jobs.lock.yaml",
    ROOT / "plans" / "repair-bench" / "jobs-q2.lock.yaml",
)


@pytest.fixture
def loosened(racks: Path, git) -> Path:
    """The racks under git, on a branch whose plan has a larger alpha; the working file is that plan."""
    git("checkout", "-q", "-b", "easier")
    plan = racks / "racks.plan.yaml"
    plan.write_text(plan.read_text(encoding="utf-8").replace("alpha: 0.05", "alpha: 0.10"), encoding="utf-8")
    git("commit", "-q", "-a", "-m", "A larger alpha")
    return plan


def test_a_loosened_plan_on_a_branch_and_the_comment_on_it(loosened, command):
    """``main:plan`` against the working file, as a check of a proposed change runs it."""
    done = command(
        "compare", "main:racks.plan.yaml", "racks.plan.yaml", "--as", "markdown", "--fail-on", "looser"
    )
    assert (done.returncode, done.stderr) == (3, "")
    assert done.stdout == (
        "### main:racks.plan.yaml → racks.plan.yaml\n"
        "\n"
        "1 change of the plan: 1 looser.\n"
        "\n"
        "| Clause | Class | What changes |\n"
        "|---|---|---|\n"
        "| alpha | looser | alpha from 0.05 to 0.10: predictors pass more easily: looser. |\n"
    )


@pytest.mark.parametrize(
    ("options", "code"),
    [
        ([], 3),
        (["--fail-on", "looser"], 3),
        (["--fail-on", "stricter"], 0),
        (["--fail-on", "different"], 0),
        (["--fail-on", "stricter", "--fail-on", "looser"], 3),
        (["--fail-on", "wording"], 2),
        (["--as", "html"], 2),
    ],
)
def test_the_exit_code_is_what_was_asked_for(loosened, command, options, code):
    """3 for what is named, 0 for anything else, 2 for what is not known."""
    done = command("compare", "main:racks.plan.yaml", "racks.plan.yaml", *options)
    assert done.returncode == code
    assert "Traceback" not in done.stderr


def test_the_same_plan_ends_with_0(racks, command):
    """Also where only its words on defaults differ."""
    full = racks / "full.plan.yaml"
    written = command("compare", "racks.plan.yaml")
    assert (written.returncode, written.stderr) == (0, "")
    full.write_text("# With every default.\n" + written.stdout, encoding="utf-8")
    done = command("compare", "racks.plan.yaml", "full.plan.yaml")
    assert (done.returncode, done.stdout, done.stderr) == (
        0,
        "racks.plan.yaml to full.plan.yaml\n  Nothing differs.\n",
        "",
    )


def test_json_is_for_programs(loosened, command):
    """A document of stable keys."""
    done = command("compare", "main:racks.plan.yaml", "racks.plan.yaml", "--as", "json")
    found = json.loads(done.stdout)
    assert done.returncode == 3
    assert found["same"] is False
    assert [(one["clause"], one["class"]) for one in found["changes"]] == [("alpha", "looser")]


def test_unusable_input_is_one_line_and_2(racks, command):
    """On either side, with nothing on standard output and nothing written."""
    before = sorted(racks.iterdir())
    for sides in (
        ("nowhere.yaml", "racks.plan.yaml"),
        ("racks.plan.yaml", "nowhere.yaml"),
        ("racks.plan.yaml", "racks.csv"),
        ("racks.plan.yaml", "racks.plan.yaml", "--data", "nowhere.csv"),
        ("no\nwhere", "racks.plan.yaml"),
    ):
        done = command("compare", *sides)
        assert (done.returncode, done.stdout, len(done.stderr.splitlines())) == (2, "", 1), sides
    assert sorted(path for path in racks.iterdir() if path.suffix != ".looks") == before


def test_two_locks_are_compared(command):
    """The plans are the same and the records differ: 3, but for a named grade 0."""
    done = command("compare", *QUARTERS, env={"COLUMNS": "90"})
    assert (done.returncode, done.stderr) == (3, "")
    assert "The plans say the same; their records differ." in done.stdout
    assert "Paths part   At R002." in done.stdout
    assert command("compare", *QUARTERS, "--fail-on", "looser").returncode == 0
    assert command("compare", QUARTERS[0], QUARTERS[0]).returncode == 0


def test_with_data_both_plans_are_run(loosened, command, racks):
    """And no lock is left behind."""
    done = command("compare", "main:racks.plan.yaml", "racks.plan.yaml", "--data", "racks.csv")
    assert (done.returncode, done.stderr) == (3, "")
    assert "The same values, 80 rows." in done.stdout
    assert not list(racks.glob("*.lock.yaml"))


@pytest.fixture
def program(racks: Path) -> str:
    """The command as git is told to call it."""
    return f"{shlex.quote(sys.executable)} -m beforehand.cli compare"


def test_git_difftool_calls_it(loosened, git, environment, program):
    """With two names of its own making."""
    env = environment | {"GIT_TERMINAL_PROMPT": "0"}
    told = git("difftool", "--no-prompt", f"--extcmd={program}", "main", "--", "racks.plan.yaml", env=env)
    assert "alpha from 0.05 to 0.10: predictors pass more easily." in told


def test_git_diff_shows_plans_with_every_default(loosened, git, environment, program, racks):
    """With one name only, as git calls what makes text of a file."""
    (racks / ".gitattributes").write_text("*.plan.yaml diff=beforehand\n", encoding="utf-8")
    told = git(
        "-c", f"diff.beforehand.textconv={program}", "diff", "main", "--", "racks.plan.yaml", env=environment
    )
    assert "-alpha: 0.05\n+alpha: 0.1\n multiplicity: none\n" in told


def test_the_hook_checks_every_plan_that_it_is_given(racks, command):
    """Several names in one call; faults of all of them, and the others are still checked."""
    (hook,) = yaml.safe_load((ROOT / ".pre-commit-hooks.yaml").read_text(encoding="utf-8"))
    assert (hook["id"], hook["language"], hook["files"]) == ("beforehand-check", "python", r"\.plan\.yaml$")
    program, *words = hook["entry"].split()
    assert program == "beforehand"
    plan = racks / "racks.plan.yaml"
    text = plan.read_text(encoding="utf-8")
    (racks / "second.plan.yaml").write_text(text, encoding="utf-8")
    done = command(*words, "racks.plan.yaml", "second.plan.yaml")
    assert (done.returncode, done.stderr) == (0, "")
    assert "racks.plan.yaml can be run" in done.stdout
    assert "second.plan.yaml can be run" in done.stdout
    plan.write_text(text.replace("0.05", "5"), encoding="utf-8")
    done = command(*words, "racks.plan.yaml", "second.plan.yaml")
    assert done.returncode == 2
    assert done.stderr == "racks.plan.yaml:11: alpha: is 5; it must lie between 0 and 1, both excluded\n"
    assert "second.plan.yaml can be run" in done.stdout
    done = command(*words, "racks.plan.yaml", "second.plan.yaml", "--json")
    assert (done.returncode, done.stderr) == (2, "--json: is for one plan at a time\n")
