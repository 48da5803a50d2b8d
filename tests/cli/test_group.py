"""The command line as a whole: help, suggestions, completion, errors as words."""

import click
import pytest
from click.shell_completion import ShellComplete

from benchlog.cli import COMMANDS, program
from tests.cli.conftest import Run


def test_help_lists_every_command_with_its_line(run: Run) -> None:
    """What a newcomer types first."""
    ran = run("--help")

    assert ran.code == 0
    for name, (_, text) in COMMANDS.items():
        assert name in ran.out
        assert " ".join(text.split()[:4]) in ran.out


def test_version_is_told(run: Run) -> None:
    """For reports of trouble."""
    assert run("--version").out.startswith("benchlog, version ")


@pytest.mark.parametrize("name", COMMANDS)
def test_every_command_has_help(run: Run, name: str) -> None:
    """Importing each module is part of the check."""
    ran = run(name, "--help")

    assert ran.code == 0
    assert "Usage: benchlog" in ran.out


def test_mistyped_command_is_guessed(run: Run) -> None:
    """Lazy commands are suggested too."""
    ran = run("jugde")

    assert ran.code == 2
    assert "Did you mean 'judge'?" in ran.err


def test_completion_knows_the_table() -> None:
    """Without importing a command."""
    complete = ShellComplete(program, {}, "benchlog", "_BENCHLOG_COMPLETE")

    assert [item.value for item in complete.get_completions([], "hi")] == ["history"]


def test_interrupt_is_130(run: Run, monkeypatch: pytest.MonkeyPatch) -> None:
    """Ctrl-C outside a sweep."""

    def interrupted(*_: object) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr("benchlog.bench.driver_read.list_drivers", interrupted)
    ran = run("driver", "list")

    assert (ran.code, ran.err) == (130, "\nstopped\n")


def test_bug_is_called_a_bug(run: Run, monkeypatch: pytest.MonkeyPatch) -> None:
    """One sentence instead of a traceback, and how to get one."""

    def broken(*_: object) -> None:
        raise ZeroDivisionError("nobody thought of this")

    monkeypatch.setattr("benchlog.bench.driver_read.list_drivers", broken)
    ran = run("driver", "list")

    assert ran.code == 1
    assert "this is a bug in benchlog: ZeroDivisionError: nobody thought of this" in ran.err


def test_bug_shows_its_traceback_when_asked(monkeypatch: pytest.MonkeyPatch) -> None:
    """With ``--debug`` the error comes out as it is."""
    monkeypatch.setattr("sys.argv", ["benchlog", "--debug", "driver", "list"])

    def broken(*_: object) -> None:
        raise ZeroDivisionError

    monkeypatch.setattr("benchlog.bench.driver_read.list_drivers", broken)
    from benchlog.cli import main

    with pytest.raises(ZeroDivisionError):
        main()


def test_lazy_group_answers_for_unknown_names() -> None:
    """None is click's own answer."""
    assert program.get_command(click.Context(program), "nothing") is None
