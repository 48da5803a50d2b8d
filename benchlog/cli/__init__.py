"""The command line: one file for each command, imported when it is called."""

import io
import os
import sys
from typing import NoReturn

import click

from benchlog import __version__
from benchlog.cli.lazy import LazyGroup
from benchlog.errors import BenchlogError, ExitCode

COMMANDS = {
    "demo": (
        "benchlog.cli.demo",
        "Sweep five invented boards on the practice bench, start to finish.",
    ),
    "new": (
        "benchlog.cli.new",
        "Make a bench folder: bench file, a design to edit, an empty logbook.",
    ),
    "driver": (
        "benchlog.cli.driver",
        "List the drivers, or check a driver file without an instrument.",
    ),
    "bench": ("benchlog.cli.bench", "Check the bench, or start the practice bench."),
    "design": ("benchlog.cli.design", "Show what a design predicts."),
    "sweep": ("benchlog.cli.sweep", "Sweep boards and judge them."),
    "import": ("benchlog.cli.import_", "Bring CSV captures into the logbook and judge them."),
    "extract": ("benchlog.cli.extract", "Draw figures from stored points again, as new rows."),
    "judge": ("benchlog.cli.judge", "Judge stored figures again, as new rows."),
    "history": ("benchlog.cli.history", "Show what was measured on a board, or on many."),
    "logbook": ("benchlog.cli.logbook", "Tell what a logbook holds."),
}


@click.group(
    cls=LazyGroup,
    table=COMMANDS,
    context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100},
)
@click.version_option(__version__, prog_name="benchlog")
@click.option(
    "--folder",
    "-C",
    default=".",
    envvar="BENCHLOG_FOLDER",
    metavar="DIR",
    help="Bench folder with bench.toml, design.toml and the logbook; the current one by default.",
)
@click.option("--debug", is_flag=True, help="Show the traceback of an error that is a bug.")
@click.pass_context
def program(context: click.Context, folder: str, *, debug: bool) -> None:
    """Sweep amplifier boards, keep every point, judge each board against its design.

    Start with `benchlog demo`, or `benchlog new DIR` for a bench folder of your own.
    """
    context.obj = {"folder": folder, "debug": debug}


def main() -> NoReturn:
    """Run the command line; the one place where errors become words and exit codes."""
    for stream in (sys.stdout, sys.stderr):
        # A console that cannot show a sign must not stop a sweep.
        if isinstance(stream, io.TextIOWrapper):
            stream.reconfigure(errors="replace")
    try:
        code = program.main(prog_name="benchlog", standalone_mode=False)
        sys.stdout.flush()
    except click.exceptions.Exit as ended:
        code = ended.exit_code
    except BaseException as error:
        if not isinstance(error, Exception | KeyboardInterrupt):
            raise
        code = _code_of(error)
    sys.exit(code if isinstance(code, int) else ExitCode.ALL_PASS)


def _code_of(error: BaseException) -> int:
    """Say what went wrong, once, and return the exit code."""
    match error:
        case click.ClickException():
            error.show()
            return error.exit_code
        case KeyboardInterrupt() | click.Abort():
            click.echo("stopped", err=True)
            return ExitCode.STOPPED
        case BenchlogError():
            click.echo(f"error: {error}", err=True)
            return error.exit_code
        case BrokenPipeError():
            # The reader went away; keep the interpreter from complaining about it at exit.
            os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
            return ExitCode.NOT_DONE
    if "--debug" in sys.argv:
        raise error
    click.echo(
        f"error: this is a bug in benchlog: {type(error).__name__}: {error}\n"
        "  do:       run it again as `benchlog --debug ...` and report what it prints",
        err=True,
    )
    return ExitCode.NOT_DONE
