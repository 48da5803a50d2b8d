"""``benchlog design``: what a design predicts."""

from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from benchlog.cli.output import print_json
from benchlog.cli.params import folder_of, json_option
from benchlog.cli.place import DESIGN

if TYPE_CHECKING:
    from benchlog.design.model import Design


@click.group(name="design", short_help="Show what a design predicts.")
def command() -> None:
    """Show what a design predicts."""


@command.command("show")
@click.argument("file", metavar="[FILE]", required=False, type=click.Path(path_type=Path))
@json_option
@click.pass_context
def show(context: click.Context, file: Path | None, *, as_json: bool) -> None:
    """Show what a design predicts: gain, noise gain, corner, GBW, budget and drive limits."""
    from benchlog.design.read import read_design

    design = read_design(file if file is not None else folder_of(context) / DESIGN)
    predicted = _predicted(design)
    if as_json:
        print_json(predicted)
        return
    _print(design, predicted)


def _predicted(design: "Design") -> dict[str, Any]:
    import numpy as np

    from benchlog.circuit.drive import drive_limit
    from benchlog.circuit.nominal import nominal_figures

    chain = design.chain()
    nominal = nominal_figures(chain)
    frequencies_hz = np.logspace(1, 7, 13)
    limit = drive_limit(chain, frequencies_hz)
    return {
        "design": {"name": design.name, "revision": design.revision, "sha256": design.sha256},
        "gain": nominal.gain,
        "gain_db": nominal.gain_db,
        "noise_gain": nominal.noise_gain,
        "corner_hz": nominal.corner_hz,
        "lower_corner_hz": nominal.lower_corner_hz,
        "gbw_hz": nominal.gbw_hz,
        "peaking_db": nominal.peaking_db,
        "drive_level_vrms": design.drive_level_vrms,
        "drive_limits": [
            {
                "frequency_hz": float(frequency_hz),
                "level_vrms": float(level_vrms) if np.isfinite(level_vrms) else None,
                "limited_by": str(why),
            }
            for frequency_hz, level_vrms, why in zip(
                frequencies_hz, limit.level_vrms, limit.limited_by, strict=True
            )
        ],
        "budget": [
            {
                "figure": line.figure,
                "min": line.minimum,
                "max": line.maximum,
                "unit": line.unit,
                "rule": line.rule or design.budget.rule,
                "guard": design.budget.guard if line.guard is None else line.guard,
            }
            for line in design.budget.lines
        ],
    }


def _print(design: "Design", predicted: dict[str, Any]) -> None:
    from benchlog.notation import plain, si
    from benchlog.report.tables import plain_table

    click.echo(f"{design.name}, revision {design.revision}  ({design.sha256[:12]})\n")
    rows = [
        ("gain", f"{plain(predicted['gain'])} V/V, {plain(predicted['gain_db'])} dB"),
        ("noise gain", _or_none(predicted["noise_gain"], "")),
        ("corner (-3 dB)", _or_none(predicted["corner_hz"], "Hz")),
        ("lower corner", _or_none(predicted["lower_corner_hz"], "Hz")),
        ("GBW, typical", _or_none(predicted["gbw_hz"], "Hz")),
        ("peaking", f"{plain(predicted['peaking_db'])} dB"),
        ("drive level", _or_none(predicted["drive_level_vrms"], "Vrms")),
    ]
    click.echo(plain_table(("nominal board", "value"), rows))
    limits = [
        (
            line["figure"],
            "-" if line["min"] is None else si(line["min"], line["unit"]),
            "-" if line["max"] is None else si(line["max"], line["unit"]),
            f"{line['rule']}, guard {plain(line['guard'])} U",
        )
        for line in predicted["budget"]
    ]
    click.echo("\n" + plain_table(("budget", "min", "max", "rule"), limits))
    drive = [
        (
            si(row["frequency_hz"], "Hz"),
            _or_none(row["level_vrms"], "Vrms"),
            row["limited_by"] or "-",
        )
        for row in predicted["drive_limits"]
    ]
    click.echo(
        "\n" + plain_table(("drive limit at", "highest level at the input", "limited by"), drive)
    )


def _or_none(value: float | None, unit: str) -> str:
    from benchlog.notation import si

    return "none" if value is None else si(value, unit)
