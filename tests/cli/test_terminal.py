from __future__ import annotations

import io
import os
import subprocess
import sys
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from beforehand.cli import terminal
from beforehand.cli.progress import Progress

pty = pytest.importorskip("pty")


class Screen(io.StringIO):
    """A stream that says it is a terminal."""

    def isatty(self) -> bool:
        """Yes."""
        return True


@pytest.mark.parametrize(("columns", "width"), [("80", 80), ("20", 40), ("200", 140), ("0", 100), ("", 100)])
def test_the_width_is_the_environments_within_reason(
    columns: str, width: int, monkeypatch: pytest.MonkeyPatch
) -> None:
    """COLUMNS between 40 and 140; without it and without a terminal 100."""
    monkeypatch.setenv("COLUMNS", columns)
    monkeypatch.setattr(os, "get_terminal_size", lambda *_: (_ for _ in ()).throw(OSError()))
    assert terminal.width() == width


@pytest.mark.parametrize(
    ("stream", "env", "coloured"),
    [
        (Screen(), {}, True),
        (Screen(), {"NO_COLOR": "1"}, False),
        (Screen(), {"NO_COLOR": ""}, True),
        (Screen(), {"TERM": "dumb"}, False),
        (io.StringIO(), {}, False),
        (None, {}, False),
    ],
)
def test_colour_is_for_terminals_that_want_it(
    stream: Any, env: dict[str, str], coloured: bool, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Never into a pipe, never against NO_COLOR."""
    monkeypatch.setenv("TERM", "xterm")
    monkeypatch.delenv("NO_COLOR", raising=False)
    for key, value in env.items():
        monkeypatch.setenv(key, value)
    monkeypatch.setattr(sys, "stdout", stream)
    assert terminal.colour() is coloured


def test_an_output_without_the_signs_still_gets_the_text(monkeypatch: pytest.MonkeyPatch) -> None:
    """R² and °C become question marks where they cannot be shown; nothing fails."""
    raw = io.BytesIO()
    monkeypatch.setattr(sys, "stdout", io.TextIOWrapper(raw, encoding="ascii"))
    terminal.say("R² 0.8, 20 °C\n")
    assert raw.getvalue() == b"R? 0.8, 20 ?C\n"


def test_a_document_is_utf8_whatever_the_output_says(monkeypatch: pytest.MonkeyPatch) -> None:
    """A plan that is piped into a file must be the same file everywhere."""
    raw = io.BytesIO()
    monkeypatch.setattr(sys, "stdout", io.TextIOWrapper(raw, encoding="ascii", newline="\r\n"))
    terminal.document("unit: °C\n")
    assert raw.getvalue() == "unit: °C\n".encode()


def test_closed_streams_are_no_fault(monkeypatch: pytest.MonkeyPatch) -> None:
    """A program that is started without streams still does its work."""
    monkeypatch.setattr(sys, "stdout", None)
    monkeypatch.setattr(sys, "stderr", None)
    terminal.say("text")
    terminal.document("text")
    terminal.note("text")


def test_progress_waits_before_it_speaks(monkeypatch: pytest.MonkeyPatch) -> None:
    """Work that is done within a second leaves no trace on a terminal."""
    screen = Screen()
    monkeypatch.setattr(sys, "stderr", screen)
    with Progress("running") as told:
        told("selection")
    assert screen.getvalue() == ""


def test_progress_is_one_line_that_is_wiped(monkeypatch: pytest.MonkeyPatch) -> None:
    """Longer work shows the last message; at the end the line is clean."""
    screen = Screen()
    monkeypatch.setattr(sys, "stderr", screen)
    monkeypatch.setattr("beforehand.cli.progress.PATIENCE", 0.01)
    monkeypatch.setattr("beforehand.cli.progress.REDRAW_EVERY", 0.01)
    with Progress("running") as told:
        told("selection")
        time.sleep(0.2)
    text = screen.getvalue()
    assert " s  selection" in text
    assert "\n" not in text
    assert text.endswith("\r\x1b[K")


@pytest.mark.parametrize("quiet", [False, True])
def test_progress_says_nothing_without_a_terminal(quiet: bool, monkeypatch: pytest.MonkeyPatch) -> None:
    """A log is not filled with lines that nobody asked for."""
    stream = io.StringIO() if not quiet else Screen()
    monkeypatch.setattr(sys, "stderr", stream)
    monkeypatch.setattr("beforehand.cli.progress.PATIENCE", 0.01)
    with Progress("running", quiet=quiet):
        time.sleep(0.05)
    assert stream.getvalue() == ""


def test_a_terminal_gets_colour_and_a_pipe_does_not(
    command: Callable[..., Any], environment: dict[str, str]
) -> None:
    """The same command, seen on a terminal and through a pipe."""
    assert "\x1b[" not in command("guide").stdout
    main, side = pty.openpty()
    env = environment | {"TERM": "xterm", "COLUMNS": "80"}
    process = subprocess.Popen([sys.executable, "-m", "beforehand.cli", "guide"], stdout=side, env=env)
    os.close(side)
    seen = b""
    while True:
        try:
            piece = os.read(main, 65536)
        except OSError:
            break
        if not piece:
            break
        seen += piece
    os.close(main)
    assert process.wait(30) == 0
    assert seen.startswith(b"\x1b[1mPages of the guide\x1b[0m\r\n")


def test_paths_are_never_made_absolute(command: Callable[..., Any], tmp_path: Path) -> None:
    """What a person typed is what is told."""
    done = command("check", "nowhere.plan.yaml", cwd=tmp_path)
    assert done.returncode == 2
    assert done.stderr.startswith("nowhere.plan.yaml: ")
    assert str(tmp_path) not in done.stderr
