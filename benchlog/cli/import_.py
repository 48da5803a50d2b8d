"""``benchlog import``: captures become sweeps of the logbook."""

import sys
from pathlib import Path
from typing import TYPE_CHECKING

import click

from benchlog.cli.output import print_json
from benchlog.cli.params import (
    HERTZ,
    SERIAL,
    design_option,
    folder_of,
    json_option,
    logbook_option,
    people_options,
)
from benchlog.cli.place import DESIGN, logbook_path, read_folder_design
from benchlog.cli.progress import ReadProgress

if TYPE_CHECKING:
    from benchlog.capture.read import Told
    from benchlog.cli.importing import Import
    from benchlog.cli.street import People
    from benchlog.design.model import Design


@click.command(name="import", short_help="Bring CSV captures into the logbook and judge them.")
@click.argument(
    "files", metavar="FILE...", nargs=-1, required=True, type=click.Path(path_type=Path)
)
@design_option
@click.option("--serial", type=SERIAL, help="The board's serial; asked for on a terminal.")
@click.option(
    "--serial-from-name",
    "pattern",
    metavar="PATTERN",
    help="Take serials from file names: '*_{serial}.csv'.",
)
@logbook_option
@people_options
@click.option(
    "--unit",
    "units",
    multiple=True,
    metavar="COLUMN=UNIT",
    help="Unit that the file does not give: gain=dB, frequency=kHz, input=Vpp, time=us ...",
)
@click.option(
    "--column",
    "columns",
    multiple=True,
    metavar="SIDE=NAME",
    help="Which column of a time record is what: input=CH1, output=CH2, time=1.",
)
@click.option(
    "--frequency", type=HERTZ, metavar="FREQ", help="Frequency of a time record, if it is known."
)
@click.option("--layout", metavar="NAME", help="Units and columns as saved by --save-layout.")
@click.option("--save-layout", metavar="NAME", help="Keep --unit and --column under a name.")
@click.option("--preview", is_flag=True, help="Show what was understood; keep nothing.")
@click.option("--yes", is_flag=True, help="Do not ask on a terminal whether to keep it.")
@click.option("--again", is_flag=True, help="Import a capture that is in the logbook already.")
@click.option("--no-original", is_flag=True, help="Keep no compressed copy of the files.")
@json_option
@click.pass_context
def command(  # noqa: PLR0913 - one parameter for each option
    context: click.Context,
    /,
    files: tuple[Path, ...],
    *,
    design_path: str | None,
    serial: str | None,
    pattern: str | None,
    logbook_path: str | None,
    units: tuple[str, ...],
    columns: tuple[str, ...],
    frequency: float | None,
    layout: str | None,
    save_layout: str | None,
    preview: bool,
    yes: bool,
    again: bool,
    no_original: bool,
    as_json: bool,
    **people: str,
) -> None:
    """Read CSV captures of one board, draw figures, judge them, and keep it all.

    A FILE is a swept table (a frequency column and gain, gain in dB, or input and output
    amplitude), a time record of two channels, or a folder of records at several frequencies; all
    records together are one curve. Without --design and without a design.toml in the bench folder
    there are figures but no verdict.
    """
    from benchlog.cli.importing import preview_json, print_preview
    from benchlog.cli.street import People

    if serial is not None and pattern is not None:
        raise click.UsageError("--serial and --serial-from-name exclude each other")
    told = _told(context, units=units, columns=columns, frequency_hz=frequency, layout=layout)
    imports = _read(
        files,
        _design(context, design_path),
        told,
        serial=serial,
        pattern=pattern,
        people=People(**people),
    )
    if save_layout is not None:
        _save_layout(context, save_layout, told)
    asks = not as_json and sys.stdin is not None and sys.stdin.isatty()
    if preview and as_json:
        print_json(preview_json(imports))
    elif preview or (asks and not yes):
        print_preview(imports)
    if preview:
        click.echo("preview: nothing was kept", err=as_json)
        return
    imports = _named_boards(imports, asks=asks)
    if asks and not yes and not click.confirm("keep it?", err=True):
        raise click.Abort
    context.exit(
        _keep(
            context,
            imports,
            logbook=logbook_path,
            again=again,
            originals=not no_original,
            as_json=as_json,
        )
    )


def _read(
    files: tuple[Path, ...],
    design: "Design | None",
    told: "Told",
    *,
    serial: str | None,
    pattern: str | None,
    people: "People",
) -> "list[Import]":
    """Read the captures of each board."""
    from benchlog.capture.naming import by_serial
    from benchlog.capture.read import capture_files, inspect_captures
    from benchlog.cli.importing import Import

    groups = {serial or "": list(files)}
    if pattern is not None:
        groups = by_serial([file for given in files for file in capture_files(given)], pattern)
    return [
        Import(serial=name, capture=capture, design=design, people=people)
        for name, group in groups.items()
        for capture in inspect_captures(group, design=design, told=told)
    ]


def _named_boards(imports: "list[Import]", *, asks: bool) -> "list[Import]":
    """Ask for the serial where none was given; a file name is only a suggestion."""
    from dataclasses import replace

    if all(one.serial for one in imports):
        return imports
    if not asks:
        raise click.UsageError("name the board with --serial: a file name is no serial")
    suggested = imports[0].capture.files[0].stem
    serial = click.prompt(f"serial (the file is called {suggested})", type=SERIAL, err=True)
    return [replace(one, serial=one.serial or serial) for one in imports]


def _keep(
    context: click.Context,
    imports: "list[Import]",
    *,
    logbook: str | None,
    again: bool,
    originals: bool,
    as_json: bool,
) -> int:
    """Keep the captures, print what became of them, and return the exit code."""
    from benchlog.cli.importing import ORIGINALS, print_notes
    from benchlog.cli.show import print_outcomes
    from benchlog.cli.street import exit_code, open_logbook

    path = logbook_path(context, logbook)
    with open_logbook(path) as opened:
        for one in () if again else imports:
            one.refuse_known(opened)
        folder = path.parent / ORIGINALS if originals else None
        outcomes = [one.keep(opened, originals=folder) for one in imports]
    for one in () if as_json else imports:
        print_notes(one)
    print_outcomes(outcomes, as_json=as_json)
    return exit_code(outcomes)


def _design(context: click.Context, path: str | None) -> "Design | None":
    if path is None and not (folder_of(context) / DESIGN).exists():
        return None
    return read_folder_design(context, path)


def _told(
    context: click.Context,
    *,
    units: tuple[str, ...],
    columns: tuple[str, ...],
    frequency_hz: float | None,
    layout: str | None,
) -> "Told":
    """Return what a person said about the files, on the line and in a saved layout."""
    from benchlog.capture.layout import read_layout
    from benchlog.capture.read import Told

    saved = Told() if layout is None else read_layout(folder_of(context), layout)
    return Told(
        units={**saved.units, **dict(_pair(text, "--unit", "gain=dB") for text in units)},
        columns={
            **saved.columns,
            **dict(_pair(text, "--column", "input=CH1") for text in columns),
        },
        frequency_hz=frequency_hz,
        progress=ReadProgress(),
    )


def _save_layout(context: click.Context, name: str, told: "Told") -> None:
    from benchlog.capture.layout import save_layout

    click.echo(f"layout kept in {save_layout(folder_of(context), name, told)}", err=True)


def _pair(text: str, option: str, example: str) -> tuple[str, str]:
    """Split ``gain=dB``."""
    name, equals, value = text.partition("=")
    if not equals or not name.strip() or not value.strip():
        raise click.BadParameter(f"{text!r} is not COLUMN=UNIT, like {example}", param_hint=option)
    return name.strip(), value.strip()
