"""Sealing, changing, running, amending, and reading the story back, as a person types it."""

from __future__ import annotations

import json
import os
import shutil
import signal
import subprocess
import sys
import time
from pathlib import Path

import numpy as np
import pytest
import yaml
from typer.testing import CliRunner

import beforehand
from beforehand.cli.app import app
from beforehand.sealing import looks_path, read_looks, read_seals, seal_path, verify_chains

ROOT = Path(__file__).parents[2]
SOURCE = Path(beforehand.__file__).parents[1]


@pytest.fixture
def plan(tmp_path):
    """The ready plan of the repair bench, in a folder of its own."""
    for name in ("jobs.plan.yaml", "jobs-q1.csv"):
        shutil.copy(ROOT / "plans" / "repair-bench" / name, tmp_path / name)
    return tmp_path / "jobs.plan.yaml"


@pytest.fixture
def invoke(monkeypatch):
    """Type a command."""
    monkeypatch.setenv("COLUMNS", "100")
    runner = CliRunner()
    return lambda *words: runner.invoke(app, [str(word) for word in words])


def changed(plan, old, new):
    """Change a line of the plan."""
    text = plan.read_text(encoding="utf-8")
    assert old in text
    plan.write_text(text.replace(old, new), encoding="utf-8")


def lock_of(plan):
    """The lock beside the plan, as any reader of YAML sees it."""
    return yaml.safe_load(plan.with_name("jobs.lock.yaml").read_text(encoding="utf-8"))


def test_the_whole_story(plan, invoke):
    """Sealed before the first look; changed; amended; each run and each lock says so."""
    assert invoke("seal", plan, "--by", "A. Mender", "--seen", "predictors").exit_code == 0
    first = invoke("run", plan)
    assert first.exit_code == 0
    assert "The plan was sealed before this run. First plan run on this outcome." in " ".join(
        first.stdout.split()
    )
    assert lock_of(plan)["seal"] == {
        "state": "sealed", "seals": 1, "before_first_look": True, "changes": [],
    }  # fmt: skip
    assert "sealed_answer" not in lock_of(plan)

    changed(plan, "alpha: 0.05", "alpha: 0.80")
    second = " ".join(invoke("run", plan).stdout.split())
    assert "The plan deviates from its seal: alpha from 0.05 to 0.8" in second
    assert "Second plan run on this outcome; 2 runs so far by 2 plans." in second
    (change,) = lock_of(plan)["seal"]["changes"]
    assert (change["clause"], change["class"]) == ("alpha", "looser")
    assert lock_of(plan)["seal"]["state"] == "deviates"

    refused = invoke("seal", plan, "--by", "A. Mender", "--seen", "everything")
    assert refused.exit_code == 2
    assert "decisions differ from seal 1" in refused.stderr
    amended = invoke(
        "seal", plan, "--by", "A. Mender", "--seen", "everything", "--amend", "Few jobs, mild noise.",
        "--kind", "gap", "--expected-effect", "one predictor more",
    )  # fmt: skip
    assert amended.exit_code == 0, amended.stderr
    assert "alpha from 0.05 to 0.80: predictors pass more easily: looser." in " ".join(amended.stdout.split())
    third = " ".join(invoke("run", plan).stdout.split())
    assert "The plan was amended after its seal" in third
    assert "As first sealed" in third
    lock = lock_of(plan)
    assert lock["seal"]["state"] == "amended"
    assert lock["seal"]["seals"] == 2
    assert len(lock["answer"]["terms"]) > len(lock["sealed_answer"]["terms"])
    assert lock["sealed_plan"]["written"]["alpha"] == 0.05

    seals = read_seals(seal_path(plan))
    assert [seal.seen for seal in seals] == ["predictors", "everything"]
    assert seals[1].amendment.expected_effect == "one predictor more"
    assert seals[1].amendment.changes[0]["class"] == "looser"
    assert seals[0].data == lock["data"]["fingerprint"]
    looks = read_looks(looks_path(plan))
    assert [look.seal for look in looks] == [seals[0].digest, seals[0].digest, seals[1].digest]
    assert looks[-1].lock == lock["digest"]
    verify_chains(plan)
    again = invoke("replay", plan.with_name("jobs.lock.yaml"))
    assert again.exit_code == 0, again.stdout + again.stderr
    assert "Every byte" in again.stdout


def test_a_seal_after_the_first_look_is_not_one_before_it(plan, invoke):
    """The order is in the register, not in anybody's word."""
    invoke("run", plan)
    assert lock_of(plan)["seal"] == {"state": "unsealed", "changes": []}
    invoke("seal", plan, "--by", "A. Mender", "--seen", "nothing")
    told = " ".join(invoke("run", plan).stdout.split())
    assert "sealed, but after the first run on this outcome" in told
    assert lock_of(plan)["seal"]["before_first_look"] is False


def test_words_break_no_seal(plan, invoke):
    """Another title is listed as wording; the state stays sealed."""
    invoke("seal", plan, "--by", "A. Mender", "--seen", "nothing")
    changed(plan, "title: ", "title: The new ")
    invoke("run", plan)
    seal = lock_of(plan)["seal"]
    assert seal["state"] == "sealed"
    assert [change["class"] for change in seal["changes"]] == ["wording"]


def test_check_and_replay_are_no_looks(plan, invoke):
    """Only a run on real data counts; the same run twice is one plan."""
    invoke("check", plan)
    assert not looks_path(plan).exists()
    invoke("run", plan)
    invoke("replay", plan.with_name("jobs.lock.yaml"))
    invoke("run", plan)
    looks = read_looks(looks_path(plan))
    assert len(looks) == 2
    assert len({look.plan for look in looks}) == 1
    assert all(json.loads(line) for line in looks_path(plan).read_text(encoding="utf-8").splitlines())


def test_sealing_twice_is_sealing_once(plan, invoke):
    """Nothing changed since: said so, and nothing appended."""
    invoke("seal", plan, "--by", "A. Mender", "--seen", "nothing")
    before = seal_path(plan).read_bytes()
    again = invoke("seal", plan, "--by", "B. Other", "--seen", "nothing")
    assert again.exit_code == 0
    assert "nothing has changed since" in again.stdout
    assert seal_path(plan).read_bytes() == before


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (["--by", "", "--seen", "nothing"], "name who seals"),
        (["--by", "A", "--seen", "noting"], "nearest: 'nothing'"),
        (["--by", "A", "--seen", "nothing", "--amend", "why"], "there is no seal to amend"),
        (["--by", "A", "--seen", "nothing", "--kind", "gap"], "belongs to an amendment"),
        (["--by", "A", "--seen", "nothing", "--data", "none.csv"], "no such file"),
        (["--seen", "nothing"], "--by"),
        (["--by", "A\x1b[31m", "--seen", "nothing"], "does not print"),
        (["--by", "A\nB", "--seen", "nothing"], "does not print"),
    ],
)
def test_what_cannot_be_sealed(plan, invoke, words, said):
    """One line, exit code 2, nothing written."""
    done = invoke("seal", plan, *words)
    assert done.exit_code == 2
    assert said in done.stderr
    assert not seal_path(plan).exists()


def test_a_broken_chain_is_refused_before_anything_is_computed(plan, invoke):
    """Run and seal name the file and the place; the lock that stands there stays."""
    invoke("seal", plan, "--by", "A. Mender", "--seen", "nothing")
    invoke("run", plan)
    lock = plan.with_name("jobs.lock.yaml")
    before = lock.read_bytes()
    changed(seal_path(plan), "A. Mender", "B. Mender")
    for words in (["run", plan], ["seal", plan, "--by", "A", "--seen", "nothing"]):
        done = invoke(*words)
        assert done.exit_code == 2
        assert "the chain of seals is broken at seal 1" in done.stderr
    assert lock.read_bytes() == before


@pytest.mark.skipif(os.name == "nt" or os.geteuid() == 0, reason="every folder can be written to")
def test_a_look_that_cannot_be_registered_is_not_taken(plan, invoke, tmp_path_factory):
    """Where the register cannot be written the run is refused before it is made."""
    lock = tmp_path_factory.mktemp("elsewhere") / "jobs.lock.yaml"
    plan.parent.chmod(0o500)
    done = invoke("run", plan, "-o", lock)
    plan.parent.chmod(0o700)
    assert done.exit_code == 2
    assert "does not permit writing" in done.stderr
    assert not lock.exists()


def test_the_table_may_come_later(plan, invoke):
    """A plan can be sealed before there are any data; the commit of its repository stands in the seal."""
    plan.with_name("jobs-q1.csv").unlink()
    git = ["git", "-C", str(plan.parent), "-c", "user.name=A", "-c", "user.email=a@example.org"]
    if shutil.which("git"):
        subprocess.run([*git, "init", "-q"], check=True)
        subprocess.run([*git, "add", plan.name], check=True)
        subprocess.run([*git, "commit", "-q", "-m", "plan"], check=True)
    assert invoke("seal", plan, "--by", "A. Mender", "--seen", "nothing").exit_code == 0
    (seal,) = read_seals(seal_path(plan))
    assert seal.data is None
    if shutil.which("git"):
        head = subprocess.run([*git, "rev-parse", "HEAD"], capture_output=True, text=True, check=True)
        assert seal.commit == head.stdout.strip()


def test_killed_at_any_moment(plan):
    """A process that is killed while it seals and runs leaves whole files and whole chains."""
    environment = {**os.environ, "PYTHONPATH": str(SOURCE), "COLUMNS": "100"}
    code = (
        "import os, sys\n"
        "from beforehand.api import run, seal, write_lock\n"
        "plan, number = sys.argv[1:]\n"
        "text = open(plan, encoding='utf-8').read()\n"
        "for turn in range(100):\n"
        "    with open(plan + '.new', 'w', encoding='utf-8') as file:\n"
        "        file.write(text.replace('alpha: 0.05', f'alpha: 0.{number}{turn + 100}'))\n"
        "    os.replace(plan + '.new', plan)\n"
        "    seal(plan, by='A', seen='nothing', amend='again' if turn or number != '10' else None)\n"
        "    write_lock(run(plan).lock, plan.replace('.plan.', '.lock.'))\n"
    )
    random = np.random.default_rng(20261201)
    original = plan.read_text(encoding="utf-8")
    for number in range(10, 22):
        plan.write_text(original, encoding="utf-8")
        before = len(read_looks(looks_path(plan)))
        process = subprocess.Popen(
            [sys.executable, "-c", code, str(plan), str(number)],
            env=environment, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL,
        )  # fmt: skip
        end = time.monotonic() + 120
        while len(read_looks(looks_path(plan))) == before and time.monotonic() < end:
            assert process.poll() is None
            time.sleep(0.02)
        for _ in range(25):
            time.sleep(float(random.uniform(0.0, 0.06)))
            # Stopped and looked at: what a kill at this moment would leave.
            process.send_signal(signal.SIGSTOP)
            verify_chains(plan)
            lock = plan.with_name("jobs.lock.yaml")
            if lock.exists():
                beforehand.read_lock(lock)
            process.send_signal(signal.SIGCONT)
        assert process.poll() is None
        process.kill()
        process.wait(30)
        verify_chains(plan)
        assert len(read_looks(looks_path(plan))) > before
