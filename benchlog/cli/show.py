"""Showing what became of boards: tables and pictures for people, JSON for scripts."""

from collections.abc import Sequence
from typing import Any

import click

from benchlog.cli.output import print_json
from benchlog.cli.street import Outcome
from benchlog.report.board_json import board_json
from benchlog.report.large import large_verdict
from benchlog.report.picture import curve_picture


def outcome_json(outcome: Outcome) -> dict[str, Any]:
    """Return a board as the README describes it."""
    design = outcome.design
    return board_json(
        serial=outcome.start.serial,
        design=None if design is None else (design.name, design.revision, design.sha256),
        sweep=outcome.start.uuid,
        state=outcome.state,
        simulated=outcome.start.simulated,
        figures=outcome.figures,
        verdict=outcome.verdict,
        why=outcome.why,
    )


def print_outcome(outcome: Outcome, *, large: bool = False, terms: bool = False) -> None:
    """Print a board for people: curve, figures, what their uncertainty is made of, verdict."""
    from benchlog.report.tables import figure_words, figures_table, terms_table, verdict_table

    mark = "   SIMULATED" if outcome.start.simulated else ""
    click.echo(f"\nserial {outcome.start.serial}   sweep {outcome.start.uuid[:8]}{mark}")
    picture = curve_picture(outcome.points, outcome.figures)
    if picture:
        click.echo(picture)
    if outcome.figures is None:
        click.echo(f"{outcome.state.upper()}: {outcome.why}")
        return
    click.echo(figures_table(outcome.figures))
    click.echo(f"shape: {outcome.figures.shape}. {outcome.figures.chosen_because}".rstrip())
    if terms:
        click.echo("\n" + terms_table(outcome.figures))
    for reason in outcome.figures.validity:
        click.echo(f"note: {reason.code}: {reason.text}")
    if outcome.verdict is None:
        click.echo("no verdict: there is no design to judge against")
        return
    click.echo(verdict_table(outcome.verdict))
    for line in outcome.verdict.lines:
        if line.reason:
            click.echo(f"note: {figure_words(line.figure)}: {line.reason}")
    word = outcome.verdict.overall
    if large:
        click.echo(large_verdict(word, outcome.start.serial))
    else:
        click.echo(f"verdict: {word.upper()}")


def print_outcomes(outcomes: Sequence[Outcome], *, as_json: bool, terms: bool = False) -> None:
    """Print boards, as one JSON array or one after another."""
    if as_json:
        print_json([outcome_json(outcome) for outcome in outcomes])
        return
    for outcome in outcomes:
        print_outcome(outcome, terms=terms)
