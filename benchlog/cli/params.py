"""Parameter types and options that several commands share."""

from collections.abc import Callable
from pathlib import Path
from typing import Any, TypeVar

import click

from benchlog.errors import QuantityError

F = TypeVar("F", bound=Callable[..., Any])

_LONGEST_SERIAL = 64


class Quantity(click.ParamType[float]):
    """An option that is read as people write quantities, by a parser of ``benchlog.quantity``.

    Args:
        name: Name of the parser: ``"hertz"``.
    """

    def __init__(self, name: str) -> None:
        self.name = name

    def convert(
        self, value: object, param: click.Parameter | None, ctx: click.Context | None
    ) -> float:
        """Return the value in the inner unit."""
        from benchlog import quantity

        field = param.name if param is not None and param.name else self.name
        try:
            return float(getattr(quantity, self.name)(value, field=field))
        except QuantityError as error:
            hint = f"; {error.hint}" if error.hint else ""
            self.fail(f"{error.what} (expected {error.expected}{hint})", param, ctx)


class Serial(click.ParamType[str]):
    """A board's serial: text, as printed or scanned, never a number."""

    name = "serial"

    def convert(
        self, value: object, param: click.Parameter | None, ctx: click.Context | None
    ) -> str:
        """Return the serial without the blanks and line ends that scanners add."""
        try:
            return clean_serial(str(value))
        except ValueError as error:
            self.fail(str(error), param, ctx)


def clean_serial(text: str) -> str:
    """Return a serial as it is kept.

    Raises:
        ValueError: It is empty, too long, or has characters that no label carries.
    """
    serial = text.strip()
    if not serial:
        raise ValueError("a serial is needed: the text on the board's label")
    if len(serial) > _LONGEST_SERIAL or not serial.isprintable():
        raise ValueError(
            f"{serial[:_LONGEST_SERIAL]!r} is no serial: at most {_LONGEST_SERIAL} printable"
            " characters"
        )
    return serial


HERTZ = Quantity("hertz")
LEVEL = Quantity("level_vrms")
SERIAL = Serial()


def json_option(function: F) -> F:
    """Add ``--json``."""
    return click.option("--json", "as_json", is_flag=True, help="Print JSON for scripts.")(function)


def design_option(function: F) -> F:
    """Add ``--design``."""
    return click.option(
        "--design",
        "design_path",
        metavar="FILE",
        help="Design file; design.toml of the bench folder by default.",
    )(function)


def logbook_option(function: F) -> F:
    """Add ``--logbook``."""
    return click.option(
        "--logbook",
        "logbook_path",
        metavar="FILE",
        help="Logbook; the bench file's, or logbook.db of the bench folder by default.",
    )(function)


def people_options(function: F) -> F:
    """Add what a person says about a measurement."""
    for name, text in reversed(
        (
            ("--operator", "Who measures."),
            ("--lot", "Lot that the board belongs to."),
            ("--reason", "Why it is measured again: setup, contact, instrument, repair ..."),
            ("--note", "Anything worth keeping."),
        )
    ):
        function = click.option(name, default="", metavar="TEXT", help=text)(function)
    return function


def folder_of(context: click.Context) -> Path:
    """Return the bench folder."""
    return Path(context.find_root().obj["folder"])
