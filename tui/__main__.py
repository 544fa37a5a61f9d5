"""``python -m kingpost.tui`` is the program."""

from kingpost.tui.cli import main

if __name__ == "__main__":
    main()
