"""``python -m beforehand`` is the command line."""

from beforehand.cli import main

if __name__ == "__main__":
    main()
