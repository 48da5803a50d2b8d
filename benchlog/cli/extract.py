"""``benchlog extract``: figures from stored points again, as new rows."""

import click

from benchlog.cli.find import find_sweep
from benchlog.cli.params import design_option, json_option, logbook_option
from benchlog.cli.place import open_existing, read_folder_design
from benchlog.cli.show import print_outcomes
from benchlog.cli.street import add_design, design_of, exit_code, settle, stored_outcome


@click.command(short_help="Draw figures from stored points again, as new rows.")
@click.argument("sweeps", metavar="SWEEP...", nargs=-1, required=True)
@design_option
@logbook_option
@click.option("--terms", is_flag=True, help="Show what each uncertainty is made of.")
@json_option
@click.pass_context
def command(
    context: click.Context,
    sweeps: tuple[str, ...],
    *,
    design_path: str | None,
    logbook_path: str | None,
    terms: bool,
    as_json: bool,
) -> None:
    """Draw figures from stored points again, and judge them; the old rows stay.

    A SWEEP is the beginning of its UUID, as history shows it, or a serial: its latest sweep.
    The design is the one the sweep was made to, unless --design names another.
    """
    with open_existing(context, logbook_path, read_only=False) as logbook:
        outcomes = []
        for name in sweeps:
            sweep = find_sweep(logbook, name)
            design = read_folder_design(context, design_path) if design_path else design_of(sweep)
            if design is not None:
                add_design(logbook, design)
            outcomes.append(settle(logbook, stored_outcome(logbook, sweep, design)))
    print_outcomes(outcomes, as_json=as_json, terms=terms)
    context.exit(exit_code(outcomes))
