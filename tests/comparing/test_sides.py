from __future__ import annotations

import os
from pathlib import Path

import pytest

import beforehand
from beforehand.comparing import read_side
from beforehand.comparing.sides import written
from beforehand.faults import BeforehandError, InputError, LockError, PlanError
from beforehand.plan import canonical_text, read_plan

LOCK = Path(__file__).parents[2] / "plans" / "repair-bench" / "jobs.lock.yaml"


@pytest.fixture
def here(racks: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """The folder of the racks as the current one."""
    monkeypatch.chdir(racks)
    return racks


def refusal(name: str) -> str:
    """The one line with which a side is refused."""
    with pytest.raises(BeforehandError) as raised:
        read_side(name)
    (line,) = str(raised.value).splitlines()
    return line


def test_a_file_is_told_by_its_content_and_not_by_its_name(here):
    """Version control hands over names of its own."""
    odd = here / "nqVx2_racks"
    odd.write_bytes((here / "racks.plan.yaml").read_bytes())
    side = read_side(odd)
    assert side.plan == read_plan(here / "racks.plan.yaml")
    assert side.lock is None
    assert read_side(LOCK).lock is not None


def test_a_lock_stands_for_its_plan(here):
    """A plan against a lock is compared with the plan that the lock holds."""
    found = beforehand.compare(LOCK.with_name("jobs.plan.yaml"), LOCK)
    assert found.changes == ()
    assert found.locks is None
    assert found.same


def test_a_revision_is_read_from_git(here, git):
    """A branch, what is staged, and a folder below; a file of that very name goes before."""
    plan = here / "racks.plan.yaml"
    plan.write_text(plan.read_text(encoding="utf-8").replace("0.05", "0.10"), encoding="utf-8")
    assert read_side("main:racks.plan.yaml").plan.alpha == 0.05
    assert read_side("HEAD:./racks.plan.yaml").plan.alpha == 0.05
    assert read_side(":racks.plan.yaml").plan.alpha == 0.05
    git("add", ".")
    assert read_side(":racks.plan.yaml").plan.alpha == 0.10
    (here / "below").mkdir()
    os.chdir(here / "below")
    assert read_side("main:../racks.plan.yaml").plan.alpha == 0.05
    os.chdir(here)
    odd = here / "main:racks.plan.yaml"
    odd.write_text(plan.read_text(encoding="utf-8").replace("0.10", "0.2"), encoding="utf-8")
    assert read_side("main:racks.plan.yaml").plan.alpha == 0.2


def test_faults_of_a_plan_in_git_have_its_name_and_lines(here, git):
    """As for a file in the folder."""
    plan = here / "racks.plan.yaml"
    plan.write_text(plan.read_text(encoding="utf-8").replace("alpha: 0.05", "alpha: 5"), encoding="utf-8")
    git("commit", "-q", "-a", "-m", "A slip")
    assert refusal("main:racks.plan.yaml") == (
        "main:racks.plan.yaml:11: alpha: is 5; it must lie between 0 and 1, both excluded"
    )


@pytest.mark.parametrize(
    ("name", "line"),
    [
        (
            "main:nowhere.plan.yaml",
            "revision 'main' has no file 'nowhere.plan.yaml' under the current folder",
        ),
        (":nowhere.plan.yaml", "what is staged has no file 'nowhere.plan.yaml' under the current folder"),
        ("mian:racks.plan.yaml", "git knows no revision 'mian' here"),
        ("HEAD~9:racks.plan.yaml", "git knows no revision 'HEAD~9' here"),
        ("main:.", "is a folder; a side is a plan or a lock"),
        ("main:../../racks.plan.yaml", "'../../racks.plan.yaml' is outside the repository"),
        ("--output=taken:racks.plan.yaml", "'--output=taken' cannot be a revision"),
        ("-p:racks.plan.yaml", "'-p' cannot be a revision"),
        ("nowhere.plan.yaml", "there is no such file"),
        ("main:", "there is no such file"),
    ],
)
def test_what_git_does_not_have_is_one_line(here, git, name, line):
    """The revision or the path is named, and nothing is written."""
    before = sorted(here.iterdir())
    assert refusal(name) == f"{name}: {line}"
    assert sorted(here.iterdir()) == before


def test_a_folder_without_git_is_one_line(here, monkeypatch):
    """And so is a machine without git, or with a git in name only."""
    monkeypatch.setenv("GIT_CEILING_DIRECTORIES", str(here.parent))
    name = "main:racks.plan.yaml"
    assert refusal(name) == f"{name}: the current folder is in no git repository"
    monkeypatch.setenv("PATH", str(here))
    assert refusal(name) == f"{name}: is a revision of git, and there is no program git on this machine"
    if os.name == "posix":
        (here / "git").write_text("#!/nowhere/at/all\n", encoding="utf-8")
        (here / "git").chmod(0o755)
        assert "git" in refusal(name)


def test_no_shell_reads_a_revision(here, git):
    """What a shell would run stays text."""
    assert "git" in refusal("$(touch taken);main:racks.plan.yaml")
    assert not (here / "taken").exists()


def test_unusable_files_are_one_line(here):
    """Empty, a folder, not a plan, too large, a damaged lock, a name that no file can have."""
    (here / "empty").write_bytes(b" \n")
    assert refusal("empty") == "empty: is empty; a comparison needs a plan or a lock on each side"
    assert refusal(os.devnull).endswith("is empty; a comparison needs a plan or a lock on each side")
    assert refusal(".") == ".: is a folder; a side is a plan or a lock"
    (here / "large").write_bytes(b"#" * 3_000_000)
    assert refusal("large") == "large: is larger than 2,000,000 bytes"
    (here / "binary").write_bytes(b"\xff\xfe\x00")
    assert refusal("binary") == "binary:1: is not UTF-8 text; save it as UTF-8"
    (here / "damaged").write_bytes(LOCK.read_bytes().replace(b"adopted", b"abopted", 1))
    assert refusal("damaged") == "damaged: it was changed after it was written: its digest does not fit"
    assert refusal("a\0b").endswith("there is no such file")
    assert "cannot be a revision" in refusal("ma\0in:racks.plan.yaml")
    with pytest.raises(LockError):
        read_side("damaged")
    with pytest.raises(PlanError):
        read_side("binary")
    with pytest.raises(InputError):
        read_side("empty")


@pytest.mark.skipif(os.name != "posix", reason="named pipes are of POSIX")
def test_a_pipe_is_read_once(here):
    """As of a shell's process substitution."""
    import threading

    os.mkfifo(here / "pipe")
    content = (here / "racks.plan.yaml").read_bytes()
    writer = threading.Thread(target=lambda: (here / "pipe").write_bytes(content))
    writer.start()
    assert read_side("pipe").plan.alpha == 0.05
    writer.join()


def test_one_side_written_out_holds_every_default(here):
    """For a tool that compares lines."""
    plan = read_plan(here / "racks.plan.yaml")
    assert written(read_side("racks.plan.yaml")) == canonical_text(plan)
    text = written(read_side(LOCK))
    assert LOCK.read_text(encoding="utf-8").startswith(text)
    assert "environment:" not in text


def test_data_is_of_no_use_for_two_locks(here):
    """They hold their results already."""
    with pytest.raises(InputError, match="--data: is of no use for two locks"):
        beforehand.compare(LOCK, LOCK, "racks.csv")


def test_with_data_the_records_are_compared_too(here):
    """Both plans are run on the table."""
    plan = here / "racks.plan.yaml"
    loose = here / "loose.plan.yaml"
    loose.write_text(plan.read_text(encoding="utf-8").replace("0.05", "0.95"), encoding="utf-8")
    found = beforehand.compare(plan, loose, here / "racks.csv")
    assert [one.clause for one in found.changes] == ["alpha"]
    assert found.locks is not None
    assert found.locks.data.same
    moon = {fate.predictor: (fate.old, fate.new) for fate in found.locks.predictors}
    assert moon == {"moon": ("removed", "adopted")}
    run = beforehand.run(plan, here / "racks.csv").lock
    assert [pair.old for pair in found.locks.coefficients if pair.old is not None] == [
        term.coefficient for term in run.answer.terms
    ]
