from __future__ import annotations

from pathlib import Path

import pytest

from beforehand.cli.targets import refuse_to_replace, require_folder
from beforehand.faults import WriteError


def test_a_folder_that_is_missing_is_found_before_the_work(tmp_path: Path) -> None:
    """A long run does not end in a path that never could be written."""
    require_folder(tmp_path / "a.lock.yaml")
    require_folder(Path("a.lock.yaml"))
    path = tmp_path / "nowhere" / "a.lock.yaml"
    with pytest.raises(WriteError) as caught:
        require_folder(path)
    assert str(caught.value) == f"{path}: cannot be written: its folder does not exist"


def test_only_files_of_our_own_making_are_replaced(tmp_path: Path) -> None:
    """An empty file and one with the sign may be written over, any other may not."""
    path = tmp_path / "a.lock.yaml"
    refuse_to_replace(path, "\nlock: ", "a lockfile")
    path.write_text("", encoding="utf-8")
    refuse_to_replace(path, "\nlock: ", "a lockfile")
    path.write_text("# Written\nlock: 1\n", encoding="utf-8")
    refuse_to_replace(path, "\nlock: ", "a lockfile")
    path.write_text("my notes", encoding="utf-8")
    with pytest.raises(WriteError) as caught:
        refuse_to_replace(path, "\nlock: ", "a lockfile")
    assert str(caught.value) == f"{path}: is not a lockfile and is left as it is; name another file"
