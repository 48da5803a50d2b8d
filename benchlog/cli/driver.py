"""``benchlog driver``: the driver files, and checking one without an instrument."""

import click

from benchlog.cli.output import print_json
from benchlog.cli.params import json_option
from benchlog.errors import ExitCode


@click.group(
    name="driver", short_help="List the drivers, or check a driver file without an instrument."
)
def command() -> None:
    """List the drivers, or check a driver file without an instrument."""


@command.command("list")
@json_option
def list_(*, as_json: bool) -> None:
    """List the drivers that are shipped."""
    from benchlog.bench.driver_read import list_drivers, read_driver
    from benchlog.report.tables import plain_table

    drivers = [read_driver(name) for name in list_drivers()]
    if as_json:
        print_json(
            [
                {
                    "name": driver.name,
                    "role": driver.role,
                    "description": driver.description,
                    "sha256": driver.sha256,
                }
                for driver in drivers
            ]
        )
        return
    rows = [(driver.name, driver.role, driver.description) for driver in drivers]
    click.echo(plain_table(("driver", "role", "what it talks to"), rows))


@command.command("check")
@click.argument("file", metavar="FILE")
@json_option
@click.pass_context
def check(context: click.Context, file: str, *, as_json: bool) -> None:
    """Replay the worked examples of a driver: FILE is a path, or the name of a shipped one."""
    from benchlog.bench.driver_check import check_driver

    results = check_driver(file)
    failed = [result for result in results if not result.passed]
    if as_json:
        print_json(
            [
                {
                    "example": result.example,
                    "message": result.message,
                    "passed": result.passed,
                    "expected": result.expected,
                    "got": result.got,
                }
                for result in results
            ]
        )
    else:
        for result in failed:
            place = f"example[{result.example}]" if result.example else "no example"
            click.echo(f"FAIL {place} of {result.message}")
            click.echo(f"  expected: {result.expected!r}")
            click.echo(f"  got:      {result.got!r}")
        click.echo(f"{file}: {len(results) - len(failed)} of {len(results)} checks pass")
    if failed:
        context.exit(ExitCode.NOT_DONE)
