"""``benchlog history``: what was measured."""

from typing import TYPE_CHECKING, Any

import click

from benchlog.cli.find import nearest_serials
from benchlog.cli.output import print_json
from benchlog.cli.params import SERIAL, json_option, logbook_option
from benchlog.cli.place import open_existing
from benchlog.errors import LogbookError
from benchlog.records import VERDICT_ORDER

if TYPE_CHECKING:
    from benchlog.logbook.rows import HistoryRow


@click.command(short_help="Show what was measured on a board, or on many.")
@click.argument("serial", metavar="[SERIAL]", required=False, type=SERIAL)
@click.option("--design", metavar="NAME", help="Only boards of this design.")
@click.option("--verdict", type=click.Choice(VERDICT_ORDER), help="Only this verdict.")
@click.option("--since", metavar="DATE", help="From this date on, like 2026-03-31.")
@click.option("--until", metavar="DATE", help="Up to and with this date.")
@click.option("--lot", metavar="TEXT", help="Only this lot.")
@click.option("--operator", metavar="TEXT", help="Only what this person measured.")
@click.option("--instrument", metavar="TEXT", help="Only with an instrument of this identity.")
@click.option("--limit", type=click.IntRange(1), help="Only the latest so many.")
@logbook_option
@json_option
@click.pass_context
def command(
    context: click.Context,
    /,
    serial: str | None,
    *,
    logbook_path: str | None,
    as_json: bool,
    **wanted: Any,  # noqa: ANN401 - one for each filter
) -> None:
    """Show every sweep of a board with its figures +- U and verdict, oldest first.

    Without SERIAL, of all boards that the options let through.
    """
    with open_existing(context, logbook_path, read_only=True) as logbook:
        rows = logbook.history(serial, **{k: v for k, v in wanted.items() if v is not None})
        if not rows and serial is not None and not any(wanted.values()):
            raise LogbookError(
                f"no board {serial!r} is in this logbook",
                where=logbook.info().path,
                hint=nearest_serials(logbook, serial) or "`benchlog history` lists all",
            )
    if as_json:
        print_json([row_json(row) for row in rows])
        return
    if not rows:
        click.echo("nothing was measured that fits")
        return
    from benchlog.report.tables import history_table

    click.echo(history_table(rows))


def row_json(row: "HistoryRow") -> dict[str, Any]:
    """Return one sweep of the history as plain data."""
    from benchlog.report.board_json import board_json

    design = None
    if row.design_name is not None and row.design_sha256 is not None:
        design = (row.design_name, row.design_revision or "", row.design_sha256)
    return board_json(
        serial=row.serial,
        design=design,
        sweep=row.sweep,
        state=row.state,
        simulated=row.simulated,
        figures=row.figures,
        verdict=row.verdict,
        why=row.why,
        kind=row.kind,
        started_at=row.started_at,
        ended_at=row.ended_at,
        operator=row.operator,
        lot=row.lot,
        reason=row.reason,
        note=row.note,
    )
