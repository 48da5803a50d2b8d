"""Run the command line with ``python -m benchlog``."""

from benchlog.cli import main

if __name__ == "__main__":
    main()
