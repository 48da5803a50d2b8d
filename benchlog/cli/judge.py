"""``benchlog judge``: stored figures judged again, as new rows."""

from dataclasses import replace

import click

from benchlog.cli.find import find_sweep
from benchlog.cli.params import design_option, json_option, logbook_option
from benchlog.cli.place import open_existing, read_folder_design
from benchlog.cli.show import print_outcomes
from benchlog.cli.street import (
    add_design,
    design_of,
    exit_code,
    judge_and_keep,
    stored_outcome,
)
from benchlog.errors import LogbookError


@click.command(short_help="Judge stored figures again, as new rows.")
@click.argument("sweeps", metavar="SWEEP...", nargs=-1, required=True)
@design_option
@logbook_option
@json_option
@click.pass_context
def command(
    context: click.Context,
    sweeps: tuple[str, ...],
    *,
    design_path: str | None,
    logbook_path: str | None,
    as_json: bool,
) -> None:
    """Judge stored figures again, against today's limits with --design; old verdicts stay.

    A SWEEP is the beginning of its UUID, as history shows it, or a serial: its latest sweep.
    """
    with open_existing(context, logbook_path, read_only=False) as logbook:
        outcomes = []
        for name in sweeps:
            sweep = find_sweep(logbook, name)
            stored = logbook.latest_figures(sweep.start.uuid)
            design = read_folder_design(context, design_path) if design_path else design_of(sweep)
            if stored is None or design is None:
                missing = "figures" if stored is None else "design"
                raise LogbookError(
                    f"sweep {sweep.start.uuid[:8]} has no {missing} to judge",
                    where=f"serial {sweep.start.serial}",
                    hint="`benchlog extract` draws figures; --design FILE names a design",
                )
            add_design(logbook, design)
            verdict = judge_and_keep(logbook, stored.id, figures=stored.figures, design=design)
            outcome = stored_outcome(logbook, sweep, design)
            outcomes.append(replace(outcome, verdict=verdict))
    print_outcomes(outcomes, as_json=as_json)
    context.exit(exit_code(outcomes))
