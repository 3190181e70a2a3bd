"""``python -m beforehand.cli`` is the command ``beforehand``."""

from beforehand.cli import main

main()
