"""The command line: each command reads, calls one function of the package, prints, exits."""

from __future__ import annotations

import sys


def main() -> None:
    """Run the program as a command; what a plan or a lock needs is imported when it is needed."""
    try:
        from beforehand.cli.app import app

        app(prog_name="beforehand")
    except KeyboardInterrupt:
        # Before a command has begun, so before its own guard.
        print("interrupted; nothing was written", file=sys.stderr)
        raise SystemExit(130) from None
