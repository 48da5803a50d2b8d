"""The command line: one file for each command, imported when it is called."""


def main() -> None:
    """Run the command line."""
    raise NotImplementedError
