"""``benchlog logbook``: the file itself."""

from dataclasses import asdict

import click

from benchlog.cli.output import print_json
from benchlog.cli.params import json_option, logbook_option
from benchlog.cli.place import open_existing


@click.group(name="logbook", short_help="Tell what a logbook holds.")
def command() -> None:
    """Tell what a logbook holds."""


@command.command("info")
@logbook_option
@json_option
@click.pass_context
def info(context: click.Context, *, logbook_path: str | None, as_json: bool) -> None:
    """Tell what a logbook holds, how it is kept, and which sweeps are unfinished."""
    with open_existing(context, logbook_path, read_only=True) as logbook:
        known = asdict(logbook.info())
    if as_json:
        print_json(known)
        return
    for name, value in known.items():
        if name != "unfinished":
            shown = ", ".join(value) if isinstance(value, list | tuple) else value
            click.echo(f"{name.replace('_', ' '):<17} {'-' if shown is None else shown}")
    unfinished = known["unfinished"]
    click.echo(f"{'unfinished':<17} {len(unfinished)}")
    for sweep in unfinished:
        click.echo(f"{'':<17} {sweep}")
