"""A file as it stands in a revision of git, read by git itself."""

from __future__ import annotations

import os
import subprocess

from beforehand.faults import Fault, InputError

# Git answers from the disk; one that takes longer waits for something.
LONGEST_WAIT = 120.0


def revision_and_path(name: str) -> tuple[str, str] | None:
    """``main:readings.plan.yaml`` as its two parts; None where it has no such form."""
    revision, colon, path = name.partition(":")
    return (revision, path) if colon and path else None


def blob(name: str, revision: str, path: str) -> bytes:
    """The content of a file in a revision.

    Parameters
    ----------
    name : str
        How faults name it.
    revision : str
        A branch, a tag, a digest; empty for what is staged.
    path : str
        Relative to the current folder.

    Raises
    ------
    InputError
        Git cannot be run, there is no repository, or it has no such revision or file.
    """
    # What begins with a dash would be an option, and options can write files.
    if revision.startswith("-") or "\0" in name:
        raise _unusable(name, f"{revision!r} cannot be a revision", "git.revision")
    spec = f"{revision}:./{path}"
    # Git speaks English, and asks nobody for a password.
    spoken = os.environ | {"LC_ALL": "C", "LANGUAGE": "C", "GIT_TERMINAL_PROMPT": "0"}
    try:
        done = subprocess.run(
            ["git", "--no-pager", "show", "--no-textconv", spec],
            stdin=subprocess.DEVNULL,
            capture_output=True,
            env=spoken,
            timeout=LONGEST_WAIT,
            check=False,
        )
    except FileNotFoundError:
        what = "is a revision of git, and there is no program git on this machine"
        raise _unusable(name, what, "git.missing") from None
    except subprocess.TimeoutExpired:
        raise _unusable(name, "git does not answer", "git.failed") from None
    except OSError as problem:
        reason = (problem.strerror or "the system refuses").lower()
        raise _unusable(name, f"git cannot be run: {reason}", "git.failed") from None
    if done.returncode != 0:
        raise _refused(name, revision, path, done.stderr.decode("utf-8", "replace"))
    if done.stdout.startswith(f"tree {spec}\n".encode()):
        raise _unusable(name, "is a folder; a side is a plan or a lock", "git.path")
    return done.stdout


def _refused(name: str, revision: str, path: str, told: str) -> InputError:
    """Why git has no such file, in plain words."""
    if "not a git repository" in told:
        return _unusable(name, "the current folder is in no git repository", "git.repository")
    where = f"revision {revision!r}" if revision else "what is staged"
    missing = f"{where} has no file {path!r} under the current folder"
    # Of what is staged git says the same whether the file or the revision is not there.
    if not revision and "unknown revision" in told:
        return _unusable(name, missing, "git.path")
    if "invalid object name" in told or "unknown revision" in told or "bad revision" in told:
        return _unusable(name, f"git knows no revision {revision!r} here", "git.revision")
    if "is outside repository" in told:
        return _unusable(name, f"{path!r} is outside the repository", "git.path")
    if "does not exist" in told or "exists on disk, but not in" in told or "is in the index, but not" in told:
        return _unusable(name, missing, "git.path")
    first = next((line for line in told.splitlines() if line.strip()), "it does not say why")
    return _unusable(name, f"git refuses: {first.removeprefix('fatal: ')}", "git.failed")


def _unusable(name: str, what: str, code: str) -> InputError:
    return InputError([Fault(file=name, line=None, place="", what=what, code=code)])
